import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Writable } from 'node:stream';
import type { CommandIo } from '../../src/cli/command.ts';
import { main } from '../../src/cli/main.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { noLog } from '../../src/service/log.ts';
import { Service } from '../../src/service/service.ts';
import { readSiteFile } from '../../src/service/site-in-force.ts';
import { wavFile } from '../acquisition/wav-writer.ts';

/**
 * A site of two machines with a few hours of recordings, taken by the real service:
 *   blower-1  de-h and nde-h, two channels of one file; steady
 *   pump-2    de-v; over its alert limit from the third hour on
 * One file of pump-2 is cut short (quarantined), one file is named by nobody (`visitor.wav`, left in the drop folder).
 */
export const beginMs = Date.UTC(2026, 2, 2, 6);
export const hourMs = 3_600_000;
export const rateHz = 2560;
const seconds = 2;

export const siteText = `site: Larkfen Waterworks
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>.wav
  start_in_name: <year><month><day>T<hour><minute><second>Z
  sample_rate: 2560 Hz
  duration: 2 s
  expected_every: 1 h
  settle: 5 s
  samples_in: m/s2
  incomplete_after: 1 min
analysis:
  line_spacing: 2.5 Hz
machine_types:
  rotating:
    bands:
      - id: overall
        quantity: velocity
        from: 10 Hz
        to: 1000 Hz
        unit: mm/s
    limits:
      - band: overall
        alert: 2.8 mm/s
        danger: 7.1 mm/s
machines:
  - id: blower-1
    name: Aeration blower 1
    type: rotating
    points:
      - id: de-h
        name: drive end horizontal
        channel: 1
        quantity: acceleration
      - id: nde-h
        name: non-drive end horizontal
        channel: 2
        quantity: acceleration
  - id: pump-2
    name: Raw water pump 2
    type: rotating
    points:
      - id: de-v
        name: drive end vertical
        channel: 1
        quantity: acceleration
`;

export interface SmallSite {
  readonly folder: string;
  readonly file: string;
  readonly clock: SteppedClock;
  readonly service: Service;
  /** Drops the hour's files and lets the service take them. */
  hour(n: number): Promise<void>;
  /** Gives the service a round at each of these moments from now on. */
  rounds(...afterMs: number[]): Promise<void>;
  /** Ends the service and removes everything. */
  remove(): Promise<void>;
}

/** Levels of pump-2 in mm/s r.m.s., an hour each. */
export const pumpLevels = [2, 2.2, 4, 4.2, 4.4];

export async function smallSite(text = siteText): Promise<SmallSite> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-cli-'));
  const file = join(folder, 'site.yaml');
  writeFileSync(file, text);
  mkdirSync(join(folder, 'drop'));
  const siteFile = readSiteFile(file);
  if ('problems' in siteFile) throw new Error(siteFile.problems.join('\n'));
  const clock = new SteppedClock(beginMs);
  const service = await Service.start({ siteFile, clock, log: noLog, threads: 1 });
  if ('refused' in service) throw new Error(service.refused);
  const rounds = async (...afterMs: number[]) => {
    const fromMs = clock.wallMs();
    for (const after of afterMs) {
      clock.advance(fromMs + after - clock.wallMs());
      await service.intakeRound();
    }
  };
  return {
    folder,
    file,
    clock,
    service,
    rounds,
    async hour(n) {
      const startMs = beginMs + n * hourMs;
      clock.advance(startMs + 10_000 - clock.wallMs());
      const stamp = `${new Date(startMs).toISOString().slice(0, 19).replace(/[-:]/g, '')}Z`;
      const drop = (name: string, bytes: Uint8Array) => writeFileSync(join(folder, 'drop', name), bytes);
      drop(`blower-1_${stamp}.wav`, sines([1.5, 1.2], n));
      drop(`pump-2_${stamp}.wav`, sines([pumpLevels[n] ?? 2], n));
      await rounds(0, 6_000, 12_000);
    },
    async remove() {
      await service.stop();
      rmSync(folder, { recursive: true });
    },
  };
}

/** Hours 0 to 4, then at 10:40 one cut file and one visitor; its clock shows 10:41:26. */
export async function livedInSite(): Promise<SmallSite> {
  const site = await smallSite();
  for (const [n] of pumpLevels.entries()) await site.hour(n);
  const whole = sines([2], 9);
  site.clock.advance(beginMs + 4 * hourMs + 40 * 60_000 + 10_000 - site.clock.wallMs());
  writeFileSync(join(site.folder, 'drop', 'pump-2_20260302T104000Z.wav'), whole.subarray(0, 5000));
  writeFileSync(join(site.folder, 'drop', 'visitor.wav'), whole);
  await site.rounds(0, 6_000, 70_000, 76_000);
  return site;
}

/** A sine of 50 Hz a channel, r.m.s. velocity in mm/s, as 32-bit floats in m/s². */
export function sines(levels: readonly number[], seed: number): Uint8Array {
  const frames = rateHz * seconds;
  const samples = new Float32Array(frames * levels.length);
  for (let n = 0; n < frames; n++) {
    for (const [channel, level] of levels.entries()) {
      const amplitude = level * 1e-3 * Math.SQRT2 * 2 * Math.PI * 50;
      const noise = Math.sin(n * n * 12.9898 + seed * 78.233 + channel) * 0.02;
      samples[n * levels.length + channel] = amplitude * Math.sin((2 * Math.PI * 50 * n) / rateHz) + noise;
    }
  }
  return wavFile({
    code: 3,
    bits: 32,
    channels: levels.length,
    rateHz,
    data: new Uint8Array(samples.buffer),
  });
}

export interface Ran {
  readonly status: number;
  readonly out: string;
  readonly err: string;
}

/** One command line in this process; what it wrote and its exit status. */
export async function run(
  args: readonly string[],
  at: { readonly workingFolder?: string; readonly clock?: CommandIo['clock'] } = {},
): Promise<Ran> {
  const out = memory();
  const err = memory();
  const { workingFolder = tmpdir(), clock } = at;
  const status = await main(args, {
    out: out.stream,
    err: err.stream,
    workingFolder,
    ...(clock === undefined ? {} : { clock }),
  });
  return { status, out: out.text(), err: err.text() };
}

function memory(): { readonly stream: Writable; text(): string } {
  const parts: Buffer[] = [];
  const stream = new Writable({
    write(part: Buffer, _encoding, done) {
      parts.push(part);
      done();
    },
  });
  return { stream, text: () => Buffer.concat(parts).toString('utf8') };
}
