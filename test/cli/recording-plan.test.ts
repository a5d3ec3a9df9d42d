/** The command recording-plan: what to set for what is to be seen, and what recordings as they are can show. */
import { execFile } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { promisify } from 'node:util';
import fc from 'fast-check';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { parse, stringify } from 'yaml';
import { loadSite } from '../../src/config/load.ts';
import { pointMeaning } from '../../src/config/meaning.ts';
import { wavFile } from '../acquisition/wav-writer.ts';
import { run, siteText } from './small-site.ts';

let folder: string;

beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'humledger-plan-'));
  writeFileSync(
    join(folder, 'site.yaml'),
    siteText.replace(
      '    name: Raw water pump 2\n',
      '    name: Raw water pump 2\n    running_speed: 1480 rpm\n',
    ),
  );
});

afterAll(() => rmSync(folder, { recursive: true }));

const ask = (...args: string[]) => run(['recording-plan', ...args], { workingFolder: folder });

interface Level {
  readonly low_db: number;
  readonly high_db: number;
}

interface PlanJson {
  readonly plan: {
    readonly sample_rate_hz: number;
    readonly duration_s: number;
    readonly window: string;
    readonly overlap_percent: number;
    readonly segment_samples: number;
    readonly line_spacing_hz: number;
    readonly averages: number;
    readonly effective_averages: number;
  };
  readonly site_file: string;
  readonly shows: { readonly line: Level; readonly unequal_tones_hz: number };
  readonly overlaps: readonly { readonly overlap_percent: number; readonly repeats_data: boolean }[];
}

async function json<T>(...args: string[]): Promise<T> {
  const { status, out, err } = await ask(...args, '--json');
  expect(err).toBe('');
  expect(status).toBe(0);
  return JSON.parse(out) as T;
}

/** The only point of a site file with these lines in it, as the program understands it. */
function loaded(lines: string) {
  const { recordings, analysis } = parse(lines) as { recordings: object; analysis: object };
  const site = {
    site: 'Larkfen Waterworks',
    time_zone: 'Europe/Dublin',
    folders: { drop: './drop', data: './data' },
    recordings: { files: '<any>.wav', samples_in: 'm/s2', expected_every: '25 h', ...recordings },
    analysis,
    machines: [{ id: 'fan-1', points: [{ id: 'de', quantity: 'acceleration' }] }],
  };
  const answer = loadSite(stringify(site), '/srv/humledger/site.yaml');
  if (!answer.ok) throw new Error(JSON.stringify(answer.problems));
  const point = answer.site.machines[0]?.points[0];
  if (point === undefined) throw new Error('no point');
  return point;
}

describe('a wish', () => {
  it('is answered on one screen: first the lines for the site file, then why', async () => {
    const { status, out } = await ask(
      '--separate',
      '49.5 Hz..50 Hz',
      '--confidence',
      '1 dB',
      '--speed',
      '900 rpm..1500 rpm',
    );
    expect(status).toBe(0);
    const lines = out.trimEnd().split('\n');
    expect(lines.length).toBeLessThanOrEqual(45);
    for (const line of lines) expect(Array.from(line).length).toBeLessThanOrEqual(80);
    expect(out.indexOf('line_spacing: 0.0977 Hz')).toBeLessThan(out.indexOf('Why'));
    const words = out.replace(/\s+/g, ' ');
    expect(words).toContain('segments of 262144 samples (10.2 s)');
    expect(words).toContain('154 of the shaft at 900 rpm in a segment');
    expect(words).toContain('from 900 rpm to 1500 rpm 1x moves over 102 lines');
    expect(words).toMatch(/50 % +\d+ +[\d.]+ .*<- as set/);
    expect(words).toContain('from 75 % on it only repeats data');
  });

  it('takes two frequencies as one range or as two words', async () => {
    const once = await json<PlanJson>('--separate', '49.5Hz..50Hz');
    expect(await json<PlanJson>('--separate', '49.5 Hz', '50 Hz')).toEqual(once);
    expect(await json<PlanJson>('--separate', '49.5..50 Hz')).toEqual(once);
    expect(once.shows.unequal_tones_hz).toBeLessThanOrEqual(0.5);
  });

  it('gives lines that, pasted into a site file, mean the plan, whatever was asked', async () => {
    await fc.assert(
      fc.asyncProperty(
        fc.record({
          spacing: fc.double({ min: 0.06, max: 40, noNaN: true }),
          highest: fc.integer({ min: 50, max: 40_000 }),
          db: fc.constantFrom(0.7, 1, 3),
          window: fc.constantFrom('hann', 'blackman-harris', 'flat-top'),
          overlap: fc.option(fc.integer({ min: 0, max: 95 }), { nil: undefined }),
        }),
        async ({ spacing, highest, db, window, overlap }) => {
          const { plan, site_file, shows } = await json<PlanJson>(
            '--line-spacing',
            `${spacing} Hz`,
            '--highest',
            `${highest} Hz`,
            '--confidence',
            `${db} dB`,
            '--window',
            window,
            ...(overlap === undefined ? [] : ['--overlap', String(overlap)]),
          );
          const point = loaded(site_file);
          const meaning = pointMeaning(point);
          expect(meaning).toMatchObject({
            sampleRateHz: plan.sample_rate_hz,
            segmentSamples: plan.segment_samples,
            averages: plan.averages,
          });
          expect(meaning?.effectiveAverages).toBeCloseTo(plan.effective_averages, 9);
          expect(point.analysis).toMatchObject({ window: plan.window, overlapPercent: plan.overlap_percent });
          expect(plan.line_spacing_hz).toBeLessThanOrEqual(spacing);
          expect(plan.sample_rate_hz / 2.56).toBeGreaterThanOrEqual(highest * (1 - 1e-9));
          expect(shows.line.high_db).toBeLessThanOrEqual(db);
        },
      ),
      { seed: 20261201, numRuns: 25 },
    );
  });

  it('of a point starts from its settings, bands and speed', async () => {
    const { plan } = await json<PlanJson>('--point', 'pump-2/de-v', '--confidence', '0.5 dB');
    expect(plan.sample_rate_hz).toBe(2560);
    // Its shaft at 1480 rpm has a name from 24.67 Hz / 25 on.
    expect(plan.line_spacing_hz).toBe(2560 / 4096);
  });
});

describe('a recording as it is', () => {
  it('by rate and length, with what it cannot show and what would', async () => {
    const { status, out } = await ask(
      '--sample-rate',
      '25.6 kHz',
      '--duration',
      '0.1 s',
      '--speed',
      '1480 rpm',
    );
    expect(status).toBe(0);
    for (const line of out.split('\n')) expect(Array.from(line).length).toBeLessThanOrEqual(80);
    const words = out.replace(/\s+/g, ' ');
    expect(words).toContain('one every 12.5 Hz: segments of 2048 samples (0.08 s)');
    expect(words).toContain('not to be had below 37.5 Hz');
    expect(words).toContain('the spectrum names no fault at 1480 rpm');
    expect(words).toContain('line_spacing: 0.98 Hz and duration: 4 s would do (5 averages)');
    expect(words).toContain('a danger is not told at once');
  });

  it('says of each wish whether it is met, and settings that meet it', async () => {
    const fixed = ['--sample-rate', '25.6 kHz', '--window', 'hann'];
    const wish = ['--separate', '24 Hz..30 Hz', '--confidence', '1.5 dB'];
    interface Reached {
      readonly asked: readonly {
        readonly asked: string;
        readonly met: boolean;
        readonly remedy: string | null;
      }[];
    }
    const now = await json<Reached>(...fixed, '--duration', '10 s', ...wish);
    expect(now.asked.map(({ met }) => met)).toEqual([true, false]);
    const duration = /duration: ([\d.]+ \w+)/.exec(now.asked[1]?.remedy ?? '')?.[1] as string;
    const then = await json<Reached>(...fixed, '--duration', duration, ...wish);
    expect(then.asked.map(({ met }) => met)).toEqual([true, true]);
  });

  it('of a file: its own rate and length', async () => {
    const data = new Uint8Array(new Float32Array(7680).map((_, n) => 0.5 * Math.sin(n)).buffer);
    writeFileSync(join(folder, 'own.wav'), wavFile({ code: 3, bits: 32, channels: 1, rateHz: 2560, data }));
    const { recording } = await json<{ recording: { sample_rate_hz: number; duration_s: number } }>(
      '--recording',
      'own.wav',
    );
    expect(recording).toMatchObject({ sample_rate_hz: 2560, duration_s: 3 });
  });

  it('of a point: by the site file', async () => {
    const { out } = await ask('--point', 'pump-2/de-v');
    expect(out).toMatch(/^Recordings of pump-2\/de-v: 2 s at 2\.56 kHz/);
    expect(out.replace(/\s+/g, ' ')).toContain('overall: -');
    expect(out.replace(/\s+/g, ' ')).toContain('line_spacing: 0.98 Hz and duration: 5 s would do');
  });

  it('too short for a segment is said', async () => {
    const { status, out } = await ask(
      '--sample-rate',
      '2560',
      '--duration',
      '1 s',
      '--line-spacing',
      '0.5 Hz',
    );
    expect(status).toBe(0);
    expect(out).toContain('Not one segment of 8192 samples (3.2 s) fits');
  });
});

describe('what cannot be done', () => {
  it.each([
    [[], 2, 'say what is to be seen'],
    [['--line-spacing', '1'], 2, "--line-spacing: '1' has no unit; write: --line-spacing '1 Hz'"],
    [['--separate', '50 Hz'], 2, "write: --separate '49.5 Hz..50 Hz'"],
    [['--confidence', '10 %'], 2, "--confidence: '10 %' is no width of a level"],
    [['--window', 'han'], 2, "write: --window 'hann'"],
    [['--duration', '10 s'], 1, 'nothing says the sample rate: add --sample-rate'],
    [['--recording', 'gone.wav'], 1, 'gone.wav: there is no such file'],
    [['--point', 'pump-2/de-w'], 2, "did you mean 'pump-2/de-v'?"],
    [['--segment', '4096', '--line-spacing', '1 Hz'], 2, 'leave one of the two out'],
    [['--highest', '20 kHz', '--sample-rate', '25.6 kHz'], 1, 'record at 51200 Hz'],
    [['--window', 'rectangular', '--separate', '1 Hz..2 Hz'], 1, 'use hann'],
  ])('%j: exit status %i, %s', async (args, status, text) => {
    const answer = await ask(...args);
    expect(answer.status).toBe(status);
    expect(answer.err).toContain(text);
    expect(answer.out).toBe('');
  });

  it('is told by the program itself too, and so are answers', async () => {
    const program = ['src/cli/start.ts', 'recording-plan'];
    const { stdout } = await promisify(execFile)(process.execPath, [...program, '--line-spacing', '1 Hz']);
    expect(stdout).toContain('line_spacing: 0.782 Hz');
    await expect(promisify(execFile)(process.execPath, program)).rejects.toMatchObject({ code: 2 });
  }, 30_000);
});
