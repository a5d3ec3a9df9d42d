import type { Measurement } from '../manipulation/measurement.ts';
import type { Pool, PooledEnvelope } from '../manipulation/pooling.ts';
import { jsonOfFinite } from './journal.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { doubleBytes, doublesOf } from './spectra.ts';

/**
 * Pools that are open: one row a point, with the mean density so far in double precision. It is all that a pool needs of
 * its recordings, so no spectrum of theirs has to be kept for it, and it changes in the one transaction of each recording:
 * whatever is killed, a recording is either counted in the pool and in the ledger, or in neither.
 */
export interface OpenPool {
  readonly pool: Pool;
  readonly newest: PoolNewest;
}

/** A density without its lines, which are kept in double precision beside the facts. */
type Lines = Omit<Pool['density'], 'density'>;

/** The newest recording of a pool, as the pool is judged by it when it ends early. */
export interface PoolNewest {
  readonly recordingId: number;
  readonly runningHours: number;
  /** Without spectrum, share and peaks; its levels name the series. */
  readonly measurement: Measurement;
}

export interface OpenPoolsTable {
  point_id: number;
  /** The newest of them. */
  recording_id: number;
  recordings: number;
  newest_used_ms: number;
  /** JSON. */
  facts: string;
  /** Float64, little-endian, one-sided mean density in (SI unit)²/Hz. */
  density: Uint8Array;
  /** Likewise, of the envelope; null: the recordings have none. */
  envelope_density: Uint8Array | null;
}

type Facts = Omit<Pool, 'density' | 'envelope'> & {
  readonly density: Lines;
  readonly envelope: (Omit<PooledEnvelope, 'density'> & { readonly density: Lines }) | null;
  readonly newest: Omit<PoolNewest, 'recordingId'>;
};

export async function loadPool(reader: Reader, pointId: number): Promise<OpenPool | null> {
  const row = await reader
    .selectFrom('open_pools')
    .selectAll()
    .where('point_id', '=', pointId)
    .executeTakeFirst();
  if (row === undefined) return null;
  const { newest, density, envelope, ...pool } = JSON.parse(row.facts) as Facts;
  const ofEnvelope = row.envelope_density;
  return {
    pool: {
      ...pool,
      density: { ...density, density: doublesOf(row.density) },
      envelope:
        envelope === null || ofEnvelope === null
          ? null
          : { ...envelope, density: { ...envelope.density, density: doublesOf(ofEnvelope) } },
    },
    newest: { ...newest, recordingId: row.recording_id },
  };
}

export async function savePool(writer: Writer, pointId: number, open: OpenPool): Promise<void> {
  const { pool, newest } = open;
  const { density, envelope } = pool;
  const { share: _, ...measurement } = newest.measurement;
  const facts: Facts = {
    ...pool,
    density: withoutLines(density),
    envelope: envelope && { ...envelope, density: withoutLines(envelope.density) },
    newest: {
      runningHours: newest.runningHours,
      measurement: bare(measurement),
    },
  };
  const row = {
    recording_id: newest.recordingId,
    recordings: pool.segments.length,
    newest_used_ms: Math.round(pool.newestUsedMs),
    facts: jsonOfFinite(facts),
    density: doubleBytes(density.density),
    envelope_density: envelope && doubleBytes(envelope.density.density),
  };
  await writer
    .insertInto('open_pools')
    .values({ point_id: pointId, ...row })
    .onConflict((conflict) => conflict.column('point_id').doUpdateSet(row))
    .execute();
}

function withoutLines({ density: _, ...lines }: Pool['density']): Lines {
  return lines;
}

/** Of its levels only the series is needed, and of the envelope what shocks it held. */
function bare(measurement: Measurement): Measurement {
  const { envelope } = measurement;
  return {
    ...measurement,
    peaks: [],
    evidence: [],
    spectrum: null,
    orders: null,
    envelope:
      envelope == null
        ? null
        : { ...envelope, peaks: [], spectrum: { ...envelope.spectrum, density: new Float32Array(0) } },
  };
}

/** Nothing happens where none is open. */
export async function dropPool(writer: Writer, pointId: number): Promise<void> {
  await writer.deleteFrom('open_pools').where('point_id', '=', pointId).execute();
}

/** Drops what is open of all other points: of those that pool no longer, or are gone. */
export async function dropOtherPools(writer: Writer, poolingPointIds: readonly number[]): Promise<void> {
  const open = await writer.selectFrom('open_pools').select('point_id').orderBy('point_id').execute();
  const pooling = new Set(poolingPointIds);
  for (const { point_id: id } of open) if (!pooling.has(id)) await dropPool(writer, id);
}
