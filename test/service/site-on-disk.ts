import { mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join, relative } from 'node:path';
import { seededNoise } from '../../src/cli/demo/noise.ts';
import { wavBytes } from '../../src/cli/demo/write-wav.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import type { Round } from '../../src/service/intake.ts';
import { createLog } from '../../src/service/log.ts';
import { Service, type ServiceOptions } from '../../src/service/service.ts';
import { readSiteFile, type SiteFile } from '../../src/service/site-in-force.ts';

/**
 * A small site in a temporary folder, and the real service on it with a clock that the test moves.
 *   press-1  points de-h and nde-h, channels 1 and 2 of one file
 *   pump-2   point de-v
 * Recordings of 0.5 s at 2560 Hz, one an hour, in m/s2 at a full scale of 100; band `overall` in acceleration from 40
 * to 1000 Hz, alert at 3 m/s2, danger at 8 m/s2, each after two recordings.
 */
export const sampleRateHz = 2560;
export const frames = 1280;
export const fullScale = 100;
export const hourMs = 3_600_000;
/** A Monday in winter, 06:00 in every zone near Greenwich. */
export const beginMs = Date.UTC(2026, 2, 2, 6);

export interface SiteChanges {
  readonly folders?: string;
  readonly recordings?: string;
  readonly press?: string;
  readonly pump?: string;
  readonly limit?: string;
  readonly mailPort?: number;
}

export function siteText(changes: SiteChanges = {}): string {
  const mail = changes.mailPort === undefined ? '' : mailText(changes.mailPort);
  return `site: Trial works
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
${indented(2, changes.folders ?? '')}recordings:
  files: <machine>_<any>.wav
  start_in_name: <year><month><day>T<hour><minute><second>Z
  sample_rate: 2560 Hz
  expected_every: 1 h
  samples_in: m/s2
  full_scale: 100 m/s2
${indented(2, changes.recordings ?? '')}analysis:
  line_spacing: 20 Hz
machine_types:
  rotating:
    bands:
      - id: overall
        quantity: acceleration
        from: 40 Hz
        to: 1000 Hz
        unit: m/s2
    limits:
      - band: overall
        alert: 3 m/s2
        danger: 8 m/s2
        on_delay: 2 recordings
${indented(8, changes.limit ?? '')}machines:
  - id: press-1
    name: Press 1
    type: rotating
    running_speed: 3000 rpm
${indented(4, changes.press ?? '')}    points:
      - id: de-h
        channel: 1
        quantity: acceleration
      - id: nde-h
        channel: 2
        quantity: acceleration
  - id: pump-2
    name: Pump 2
    type: rotating
    running_speed: 1500 rpm
${indented(4, changes.pump ?? '')}    points:
      - id: de-v
        channel: 1
        quantity: acceleration
${mail}`;
}

function mailText(port: number): string {
  return `mail:
  from: humledger@trial.example
  server:
    host: 127.0.0.1
    port: ${port}
    security: none
  to:
    - address: maintenance@trial.example
    - address: shift@trial.example
summary:
  at: '06:30'
  to:
    - address: maintenance@trial.example
`;
}

function indented(spaces: number, text: string): string {
  return text
    .split('\n')
    .filter((line) => line.trim() !== '')
    .map((line) => `${' '.repeat(spaces)}${line}\n`)
    .join('');
}

/** 20260302T060000Z */
export function stamp(ms: number): string {
  return `${new Date(ms).toISOString().slice(0, 19).replace(/[-:]/g, '')}Z`;
}

/** m/s2 r.m.s. of a tone at 200 Hz in a little noise; the same seed gives the same samples. */
export function signal(levelRms: number, seed: number, samples = frames): Float64Array {
  const noise = seededNoise(seed);
  return Float64Array.from(
    { length: samples },
    (_, n) =>
      levelRms * Math.SQRT2 * Math.sin((2 * Math.PI * 200 * n) / sampleRateHz + seed) +
      0.05 * levelRms * noise.gaussian(),
  );
}

/** A WAV file of 16 bits; a channel is its level in m/s2, or its samples in m/s2. */
export function wav(
  channels: readonly (number | Float64Array)[],
  seed = 1,
  rateHz = sampleRateHz,
): Uint8Array {
  const samples = channels.map((one, n) => (typeof one === 'number' ? signal(one, seed + 1000 * n) : one));
  return wavBytes(
    samples.map((channel) => channel.map((value) => value / fullScale)),
    rateHz,
  );
}

/** The folder of a site; `data` may lie elsewhere, on another file system. */
export interface SiteOnDisk {
  readonly folder: string;
  readonly drop: string;
  readonly data: string;
  readonly siteFile: SiteFile;
  remove(): void;
}

export function makeSite(changes: SiteChanges = {}, dataFolder?: string): SiteOnDisk {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-site-'));
  const path = join(folder, 'site.yaml');
  const text = siteText(changes);
  writeFileSync(path, dataFolder === undefined ? text : text.replace('./data', dataFolder));
  mkdirSync(join(folder, 'drop'));
  return {
    ...siteAt(folder),
    remove: () => {
      rmSync(folder, { recursive: true, force: true });
      if (dataFolder !== undefined) rmSync(dataFolder, { recursive: true, force: true });
    },
  };
}

export function siteAt(folder: string): Omit<SiteOnDisk, 'remove'> {
  const siteFile = readSiteFile(join(folder, 'site.yaml'));
  if ('problems' in siteFile) throw new Error(siteFile.problems.join('\n'));
  const { drop, data } = siteFile.site.folders;
  return { folder, drop, data, siteFile };
}

export interface LogLine {
  readonly level: string;
  readonly msg: string;
  readonly [key: string]: unknown;
}

/** The running service of a site. */
export class TrialService {
  readonly site: Omit<SiteOnDisk, 'remove'>;
  readonly clock: SteppedClock;
  readonly service: Service;
  readonly log: readonly LogLine[];
  #stopped = false;

  private constructor(
    site: Omit<SiteOnDisk, 'remove'>,
    clock: SteppedClock,
    service: Service,
    log: readonly LogLine[],
  ) {
    this.site = site;
    this.clock = clock;
    this.service = service;
    this.log = log;
  }

  static async start(
    site: Omit<SiteOnDisk, 'remove'>,
    options: Partial<ServiceOptions> & { readonly clock?: SteppedClock } = {},
  ): Promise<TrialService> {
    const clock = options.clock ?? new SteppedClock(beginMs);
    const log: LogLine[] = [];
    const service = await Service.start({
      siteFile: site.siteFile,
      threads: 1,
      log: createLog({ write: (line) => log.push(JSON.parse(line)) }),
      ...options,
      clock,
    });
    if ('refused' in service) throw new Error(service.refused);
    return new TrialService(site, clock, service, log);
  }

  /** A logger puts a file into the drop folder. */
  drop(name: string, bytes: Uint8Array | string): void {
    writeFileSync(join(this.site.drop, name), bytes);
  }

  /** The usual recording of an hour: both machines, at these levels. */
  dropHour(hour: number, levels: { readonly press?: number; readonly pump?: number } = {}): void {
    const at = stamp(beginMs + hour * hourMs);
    const { press = 1, pump = 1 } = levels;
    this.drop(`press-1_${at}.wav`, wav([press, press], 10 * hour + 1));
    this.drop(`pump-2_${at}.wav`, wav([pump], 10 * hour + 5));
  }

  /** Time passes, then the service takes a round. */
  async after(ms: number): Promise<Round> {
    this.clock.advance(ms);
    return this.service.intakeRound();
  }

  /** What lies in the drop folder now is noticed, settles and is taken. */
  async take(): Promise<Round> {
    await this.service.intakeRound();
    return this.after(6_000);
  }

  /** Files are dropped in an hour of their own and taken; the clock goes on to that hour. */
  async hour(hour: number, levels: { readonly press?: number; readonly pump?: number } = {}): Promise<Round> {
    this.toHour(hour);
    this.dropHour(hour, levels);
    return this.take();
  }

  /** The clock goes on to ten seconds after the hour. */
  toHour(hour: number): void {
    this.clock.advance(Math.max(0, beginMs + hour * hourMs + 10_000 - this.clock.wallMs()));
  }

  /** Rows of the ledger, as plain objects. */
  rows(table: string, columns: string, rest = ''): Promise<Record<string, unknown>[]> {
    return this.service.ledger.read(async (reader) => {
      const { sql } = await import('kysely');
      const answer = await sql
        .raw<Record<string, unknown>>(`select ${columns} from ${table} ${rest}`)
        .execute(reader as never);
      return answer.rows;
    });
  }

  /** What became of the files, by their names. */
  async outcomes(): Promise<Record<string, string>> {
    const rows = await this.rows('recordings', 'file_name, outcome, reason', 'order by id');
    return Object.fromEntries(
      rows.map(({ file_name, outcome, reason }) => [
        file_name,
        reason === null ? outcome : `${outcome}: ${reason}`,
      ]),
    ) as Record<string, string>;
  }

  /** Alarms and troubles that are not normal: `key condition`. */
  async standing(): Promise<string[]> {
    const rows = await this.rows(
      'alarm_states',
      'subject, condition',
      "where condition <> 'normal' order by key",
    );
    return rows.map(({ subject, condition }) => `${shortSubject(subject as string)} ${condition}`).sort();
  }

  /** Journal as `event subject`, in its order. */
  async journal(): Promise<string[]> {
    const rows = await this.rows(
      'journal',
      'event, subject',
      'left join alarm_states using (key) order by sequence',
    );
    return rows.map(({ event, subject }) =>
      subject === null ? String(event) : `${event} ${shortSubject(subject as string)}`,
    );
  }

  said(text: string | RegExp): LogLine[] {
    return this.log.filter((line) => JSON.stringify(line).match(text) !== null);
  }

  files(folder: 'drop' | 'data', below = '.'): string[] {
    return filesBelow(join(this.site[folder], below));
  }

  async stop(): Promise<void> {
    if (this.#stopped) return;
    this.#stopped = true;
    await this.service.stop();
  }
}

function shortSubject(text: string): string {
  const { kind, trouble, limitId, machineId, pointId, source } = JSON.parse(text);
  const where = machineId === null ? (source ?? 'site') : [machineId, pointId].filter(Boolean).join('/');
  return `${kind === 'trouble' ? trouble : limitId} ${where}`;
}

/** Paths of all files below a folder, sorted; none where it does not exist. */
export function filesBelow(folder: string): string[] {
  if (statSync(folder, { throwIfNoEntry: false }) === undefined) return [];
  return readdirSync(folder, { recursive: true, withFileTypes: true })
    .filter((entry) => !entry.isDirectory())
    .map((entry) => relative(folder, join(entry.parentPath, entry.name)))
    .sort();
}

export function textOf(folder: string, path: string): string {
  return readFileSync(join(folder, path), 'utf8');
}
