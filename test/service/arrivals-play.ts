import fc from 'fast-check';
import { sql } from 'kysely';
import { expect } from 'vitest';
import { SimulatedDrop } from './simulated-drop.ts';
import { hourMs, makeSite, type SiteOnDisk, stamp } from './site-on-disk.ts';

/**
 * Loggers as they are at their worst: clocks that jump, power cycles, gaps, batches in any order, files that come
 * again. What is held against the ledger afterwards is the promise of the clock rules.
 */
export const minuteMs = 60_000;
const dayMs = 24 * hourMs;
const toleranceMs = 5 * minuteMs;
const overdueAfterMs = 2 * hourMs;
const machines = ['press-1', 'pump-2'] as const;
const year2000 = Date.UTC(2000, 0, 1, 8);

export interface Deed {
  readonly machine: (typeof machines)[number];
  /** What passes before it. */
  readonly waitMs: number;
  /** What happens to the logger's clock: nothing, an error of so much from now on, or back to 2000. */
  readonly clock: 'as it is' | 'power cycle' | number;
  /** Hourly files that arrive together, the newest recorded just now; in the order that the seed gives. */
  readonly files: number;
  readonly seed: number;
  /** The whole deed, so many times. */
  readonly times: number;
  readonly loud: boolean;
  readonly also: 'nothing' | 'the last file again' | 'a second version of the last file';
}

export const deeds: fc.Arbitrary<Deed[]> = fc.array(
  fc.record({
    machine: fc.constantFrom(...machines),
    waitMs: fc.constantFrom(
      ...[10, 20, 30, 60, 60, 60, 60, 90, 119, 180, 1500].map((minutes) => minutes * minuteMs),
    ),
    clock: fc.oneof(
      { weight: 12, arbitrary: fc.constant('as it is' as const) },
      { weight: 2, arbitrary: fc.constant('power cycle' as const) },
      {
        weight: 4,
        arbitrary: fc.constantFrom(
          0,
          3 * minuteMs,
          -30 * minuteMs,
          -hourMs,
          -3 * hourMs,
          hourMs,
          dayMs,
          -30 * dayMs,
        ),
      },
    ),
    files: fc.oneof(
      { weight: 5, arbitrary: fc.constant(1) },
      { weight: 1, arbitrary: fc.integer({ min: 2, max: 7 }) },
    ),
    seed: fc.nat(1000),
    times: fc.oneof(
      { weight: 12, arbitrary: fc.constant(1) },
      { weight: 1, arbitrary: fc.integer({ min: 2, max: 9 }) },
    ),
    loud: fc.boolean(),
    also: fc.oneof(
      { weight: 6, arbitrary: fc.constant('nothing' as const) },
      { weight: 1, arbitrary: fc.constant('the last file again' as const) },
      { weight: 1, arbitrary: fc.constant('a second version of the last file' as const) },
    ),
  }),
  { minLength: 8, maxLength: 45 },
);

export class ArrivalsPlay {
  readonly #drop: SimulatedDrop;
  readonly #loudness = new Map<string, number>();
  readonly #errorMs = new Map<string, number>();
  #dropped = 0;

  private constructor(drop: SimulatedDrop) {
    this.#drop = drop;
  }

  static async on(site: SiteOnDisk): Promise<ArrivalsPlay> {
    return new ArrivalsPlay(await SimulatedDrop.on(site));
  }

  async play(all: readonly Deed[]): Promise<void> {
    for (const deed of all) for (let n = 0; n < deed.times; n++) await this.#deed(deed);
  }

  end(): Promise<void> {
    return this.#drop.ledger.close();
  }

  async #deed({ machine, waitMs, clock: change, files, seed, loud, also }: Deed): Promise<void> {
    const { clock } = this.#drop;
    clock.advance(waitMs);
    if (change === 'power cycle') this.#errorMs.set(machine, year2000 - clock.wallMs());
    else if (change !== 'as it is') this.#errorMs.set(machine, change);
    const shownMs = clock.wallMs() + (this.#errorMs.get(machine) ?? 0);
    const order = Array.from({ length: files }, (_, n) => n).sort(
      (a, b) => ((a * 7919 + seed * 104_729) % 1009) - ((b * 7919 + seed * 104_729) % 1009),
    );
    let last = '';
    let content = '';
    for (const back of order) {
      last = `${machine}_${stamp(shownMs - back * hourMs)}.wav`;
      content = this.#put(last, loud && back <= 1 ? 9 : 1);
      if (files > 1) clock.advance(3_000);
    }
    await this.#drop.untilTaken();
    if (also === 'nothing') return;
    const level = this.#loudness.get(content) ?? 1;
    if (also === 'the last file again') this.#put(last, level, content);
    else this.#put(last, level);
    await this.#drop.untilTaken();
  }

  #put(name: string, level: number, same?: string): string {
    const content = same ?? `c${this.#dropped}x`;
    this.#loudness.set(content, level);
    this.#drop.drop({ name, content, level });
    this.#dropped++;
    return content;
  }

  /** Every promise, against what the ledger holds. */
  async check(): Promise<{ readonly files: number; readonly late: number; readonly clockTroubles: number }> {
    const rows = await this.#rows<Row>(
      `select r.id, source_id, s.name as source, content_sha256, arrived_ms, used_ms, evaluated, outcome, reason
        from recordings r join sources s on s.id = source_id order by r.id`,
    );
    expect(rows.length, 'each file decided on once').toBe(this.#dropped);
    const lastEvaluatedMs = new Map<number, number>();
    const newestUsedMs = new Map<number, number>();
    for (const row of rows.filter(({ outcome }) => outcome === 'taken')) {
      const newestMs = newestUsedMs.get(row.source_id) ?? Number.NEGATIVE_INFINITY;
      if (row.evaluated === 1) {
        expect(row.used_ms, `used time of ${row.id} goes on`).toBeGreaterThan(newestMs);
        expect(row.used_ms).toBeLessThanOrEqual(Math.max(row.arrived_ms + toleranceMs, newestMs + 1));
        newestUsedMs.set(row.source_id, row.used_ms);
        lastEvaluatedMs.set(row.source_id, row.arrived_ms);
      }
      const blindMs = row.arrived_ms - (lastEvaluatedMs.get(row.source_id) ?? Number.NEGATIVE_INFINITY);
      expect(blindMs, `nothing evaluated up to ${row.id}`).toBeLessThanOrEqual(overdueAfterMs);
    }
    await this.#checkExceedances(rows);
    const clockTroubles = await this.#rows<{ n: number }>(
      "select count(*) as n from journal where event = 'raised' and key like 'trouble:clock%'",
    );
    return {
      files: rows.length,
      late: rows.filter(({ evaluated, outcome }) => outcome === 'taken' && evaluated === 0).length,
      clockTroubles: clockTroubles[0]?.n ?? 0,
    };
  }

  async #checkExceedances(rows: readonly Row[]): Promise<void> {
    const events = await this.#rows<Event>(
      `select recording_id, j.key, event, j.after, exists (select 1 from to_tell t where t.key = j.key and t.event = j.event
        and t.number is j.number) as told from journal j where j.key like 'limit:%' order by sequence`,
    );
    const conditions = new Map<string, string>();
    for (const row of rows) {
      const own = events.filter(({ recording_id }) => recording_id === row.id);
      for (const { key, after } of own) if (after !== null) conditions.set(key, after);
      const loud = (this.#loudness.get(row.content_sha256.replace(/0+$/, '')) ?? 0) > 8;
      const again = row.outcome !== 'taken' || (row.reason ?? '').startsWith('a second version');
      for (const { event, told } of own)
        if (['raised', 'rose', 'exceeded-came-late'].includes(event))
          expect(told, `${event} of ${row.id} told`).toBe(1);
      if (!loud || again) continue;
      const said = own.some(({ event }) => event === 'exceeded-came-late' || event === 'raised');
      const machine = row.source.split('_')[0];
      const stands = [...conditions].some(
        ([key, condition]) => condition === 'danger' && key.startsWith(`limit:${machine}/`),
      );
      expect(said || stands, `exceedance of ${row.id} is told`).toBe(true);
    }
  }

  async #rows<T>(text: string): Promise<T[]> {
    const { rows } = await this.#drop.ledger.read((reader) => sql.raw<T>(text).execute(reader as never));
    return rows;
  }
}

/** Plays one story on a site of its own and checks it; adds up what was seen. */
export async function promisesHold(
  all: readonly Deed[],
  seen: { files: number; late: number; clockTroubles: number },
): Promise<void> {
  const site = makeSite({ folders: 'after_reading: delete' });
  const play = await ArrivalsPlay.on(site);
  try {
    await play.play(all);
    const { files, late, clockTroubles } = await play.check();
    seen.files += files;
    seen.late += late;
    seen.clockTroubles += clockTroubles;
  } finally {
    await play.end();
    site.remove();
  }
}

interface Row {
  readonly id: number;
  readonly source_id: number;
  readonly source: string;
  readonly content_sha256: string;
  readonly arrived_ms: number;
  readonly used_ms: number;
  readonly evaluated: number;
  readonly outcome: string;
  readonly reason: string | null;
}

interface Event {
  readonly recording_id: number | null;
  readonly key: string;
  readonly event: string;
  readonly after: string | null;
  readonly told: number;
}
