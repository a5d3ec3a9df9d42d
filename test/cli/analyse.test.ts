import { execFile } from 'node:child_process';
import { mkdirSync, mkdtempSync, readFileSync, rmSync, symlinkSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { wavFile } from '../acquisition/wav-writer.ts';
import { type GoldenInput, goldenSamples } from '../signal/golden-samples.ts';
import { pulseChannel } from '../signal/pulse-channel.ts';
import { seededRandom } from '../signal/random.ts';
import { run, siteText } from './small-site.ts';

let folder = '';
beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'humledger-analyse-'));
});
afterAll(() => rmSync(folder, { recursive: true }));

/** As 64-bit floats, so that the file costs no digits. */
function exactWav(rateHz: number, ...channels: readonly Float64Array[]): Uint8Array {
  const frames = channels[0]?.length ?? 0;
  const all = new Float64Array(frames * channels.length);
  for (const [c, samples] of channels.entries())
    for (let n = 0; n < frames; n++) all[n * channels.length + c] = samples[n];
  return wavFile({ code: 3, bits: 64, channels: channels.length, rateHz, data: new Uint8Array(all.buffer) });
}

function sine(
  rateHz: number,
  frames: number,
  ...tones: readonly (readonly [amplitude: number, hz: number, phase: number])[]
) {
  return Float64Array.from({ length: frames }, (_, n) =>
    tones.reduce(
      (sum, [amplitude, hz, phase]) => sum + amplitude * Math.sin((2 * Math.PI * hz * n) / rateHz + phase),
      0,
    ),
  );
}

function put(name: string, bytes: Uint8Array): string {
  writeFileSync(join(folder, name), bytes);
  return name;
}

interface Level {
  level: number;
  interval_low: number;
  interval_high: number;
  unit: string;
  detector: string;
}
interface Analysed {
  file: string;
  channels: {
    channel: string;
    unit: string;
    machine: string | null;
    point: string | null;
    waveform: Record<string, number>;
    averaging: Record<string, number | string | null> | null;
    bands: Level[];
    peaks: { frequency_hz: number; level: number; order: number | null; names: string[] }[];
    quality: { flag: string; detail: string }[];
    spectrum?: { line_spacing_hz: number; unit: string; density: number[] };
  }[];
}

async function json(...args: string[]): Promise<Analysed> {
  const ran = await run(['analyse', '--json', ...args], { workingFolder: folder });
  expect(ran.err).toBe('');
  expect(ran.status).toBe(0);
  return JSON.parse(ran.out) as Analysed;
}

describe('levels of signals whose level is known', () => {
  test('1 g r.m.s. at ω = 1000 rad/s through a sensor of 100 mV/g reads 9.80665 m/s² and 9.80665 mm/s', async () => {
    const rateHz = 8192;
    const hz = 1000 / (2 * Math.PI);
    const volts = sine(rateHz, 10 * rateHz, [0.1 * Math.SQRT2, hz, 0.3]);
    const counts = Int16Array.from(volts, (value) => Math.round((value / 10) * 32768));
    const file = put('one-g.wav', wavFile({ rateHz, bits: 16, data: new Uint8Array(counts.buffer) }));
    const { channels } = await json(
      ...['--sensitivity', '100 mV/g', '--samples-in', 'V', '--full-scale', '10', '--segment', '8192'],
      ...['--band', '100..200', '--band', '100..200:velocity', '--band', '100..200:displacement', file],
    );
    const [channel] = channels;
    expect(channel?.unit).toBe('m/s²');
    const [acceleration, velocity, displacement] = channel?.bands ?? [];
    // 16 bits of 10 V: 0.3 mV steps on 100 mV r.m.s., and lines of 1 Hz weigh velocity line by line.
    expect(acceleration?.level).toBeCloseTo(9.80665, 2);
    expect(velocity?.level).toBeCloseTo(9.80665, 2);
    expect(displacement?.level).toBeCloseTo(9.80665, 1);
    expect([acceleration?.unit, velocity?.unit, displacement?.unit]).toEqual(['m/s²', 'mm/s', 'µm']);
    expect(channel?.peaks[0]?.frequency_hz).toBeCloseTo(hz, 2);
    expect(channel?.peaks[0]?.level).toBeCloseTo(9.80665, 2);
    expect(channel?.waveform.crest_factor).toBeCloseTo(Math.SQRT2, 2);
  });

  test('velocity from three tones of acceleration leaves out the one below the band', async () => {
    const rateHz = 5120;
    const a = sine(rateHz, 10 * rateHz, [10, 50, 0], [20, 800, 1], [50, 5, 0]);
    const file = put('tones.wav', exactWav(rateHz, a));
    const { channels } = await json(
      ...['--samples-in', 'm/s2', '--segment', '4096', '--band', '10..1000:velocity', file],
    );
    const exact = 1000 * Math.hypot(10 / (2 * Math.PI * 50), 20 / (2 * Math.PI * 800)) * Math.SQRT1_2;
    expect(exact).toBeCloseTo(22.68307, 5);
    const level = channels[0]?.bands[0]?.level ?? 0;
    expect(Math.abs(level / exact - 1)).toBeLessThan(1e-3);
  });

  test('samples in g are shown in m/s², a CSV without time takes its rate from --sample-rate', async () => {
    const rows = Array.from(sine(1000, 2000, [Math.SQRT2, 100, 0]), (value) => value.toFixed(9));
    const file = put('in-g.csv', new TextEncoder().encode(`a\n${rows.join('\n')}\n`));
    const { channels } = await json(
      '--samples-in',
      'g',
      '--sample-rate',
      '1000',
      '--segment',
      '1024',
      '--band',
      '50..150',
      file,
    );
    expect(channels[0]?.bands[0]?.level).toBeCloseTo(9.80665, 3);
    const without = await run(['analyse', '--samples-in', 'g', file], { workingFolder: folder });
    expect(without).toMatchObject({
      status: 1,
      err: 'in-g.csv: the file does not say its sample rate; give --sample-rate\n',
    });
  });
});

test('the density is that of SciPy, line by line, in full precision', async () => {
  const golden = JSON.parse(readFileSync(new URL('../golden/density.json', import.meta.url), 'utf8')) as {
    sample_rate_hz: number;
    inputs: Record<string, GoldenInput>;
    lines: Record<string, number[]>;
    cases: Record<string, never>[];
  };
  const cases = (golden.cases as unknown as GoldenCase[]).filter(
    ({ segment_samples, overlap_percent }) =>
      segment_samples === 1024 && [0, 50, 75].includes(overlap_percent),
  );
  expect(cases.length).toBeGreaterThanOrEqual(18);
  for (const one of cases) {
    const samples = goldenSamples(one.samples, golden.inputs[one.input] as GoldenInput);
    const file = put('golden.wav', exactWav(golden.sample_rate_hz, samples));
    const { channels } = await json(
      ...['--samples-in', 'm/s2', '--window', one.window, '--segment', '1024'],
      ...['--overlap', String(one.overlap_percent), '--spectrum', file],
    );
    const spectrum = channels[0]?.spectrum;
    expect(spectrum?.unit).toBe('(m/s²)²/Hz');
    expect(spectrum?.line_spacing_hz).toBe(25);
    golden.lines['1024']?.forEach((line, i) => {
      const expected = one.density[i] ?? Number.NaN;
      const error = Math.abs((spectrum?.density[line] ?? Number.NaN) - expected);
      expect(error, `${one.window} ${one.overlap_percent} % line ${line}`).toBeLessThanOrEqual(
        Math.max(1e-9 * expected, 1e-14 * one.largest),
      );
    });
  }
});

interface GoldenCase {
  window: string;
  segment_samples: number;
  overlap_percent: number;
  input: string;
  samples: number;
  largest: number;
  density: number[];
}

describe('the shape of the answer', () => {
  test('one object a file, its names spelled as promised; the density only where it is asked for', async () => {
    const file = put('shape.wav', exactWav(2560, sine(2560, 5120, [1, 100, 0])));
    const answer = await json(
      '--samples-in',
      'm/s2',
      '--band',
      '10..1000:velocity',
      '--segment',
      '1024',
      file,
    );
    expect(Object.keys(answer)).toEqual([
      ...['file', 'sha256', 'start', 'start_origin', 'sample_rate_hz', 'duration_s', 'channels'],
    ]);
    const [channel] = answer.channels;
    expect(Object.keys(channel ?? {})).toEqual([
      ...[
        'channel',
        'machine',
        'point',
        'quantity',
        'unit',
        'speed',
        'waveform',
        'averaging',
        'bands',
        'peaks',
      ],
      ...['orders', 'envelope', 'evidence', 'quality'],
    ]);
    expect(Object.keys(channel?.waveform ?? {})).toEqual([
      'mean',
      'rms',
      'peak',
      'crest_factor',
      'kurtosis',
      'skewness',
    ]);
    expect(Object.keys(channel?.averaging ?? {})).toEqual([
      ...[
        'window',
        'overlap_percent',
        'segment_samples',
        'line_spacing_hz',
        'averages',
        'effective_averages',
      ],
      ...['used_percent', 'segment_spread'],
    ]);
    expect(Object.keys(channel?.bands[0] ?? {})).toEqual([
      ...[
        'band',
        'from_hz',
        'to_hz',
        'quantity',
        'unit',
        'detector',
        'level',
        'interval_low',
        'interval_high',
      ],
      'confidence_percent',
    ]);
    expect(Object.keys(channel?.peaks[0] ?? {})).toEqual([
      ...['frequency_hz', 'level', 'unit', 'order', 'above_floor_db', 'names'],
    ]);
    expect(answer).toMatchObject({
      file: 'shape.wav',
      start_origin: 'modification-time',
      sample_rate_hz: 2560,
      duration_s: 2,
    });
    expect(channel).toMatchObject({ channel: '1', machine: null, point: null, envelope: null, speed: null });
    expect(channel?.averaging).toMatchObject({
      window: 'hann',
      overlap_percent: 50,
      averages: 9,
      used_percent: 100,
    });
    const asked = await json('--samples-in', 'm/s2', '--segment', '1024', '--spectrum', file);
    expect(asked.channels[0]?.spectrum?.density).toHaveLength(513);
  });

  test('several files make an array; one that cannot be read is told, the others go on, exit status 1', async () => {
    const good = put('good.wav', exactWav(2560, sine(2560, 5120, [1, 100, 0])));
    const bad = put('bad.wav', new TextEncoder().encode('no recording at all'));
    const ran = await run(['analyse', '--json', '--samples-in', 'm/s2', bad, good, 'nothing.wav'], {
      workingFolder: folder,
    });
    expect(ran.status).toBe(1);
    expect((JSON.parse(ran.out) as Analysed[]).map(({ file }) => file)).toEqual(['good.wav']);
    expect(ran.err).toBe(
      'bad.wav: no reader knows this kind of file; WAV, CSV, UFF 58, NPY or HDF5 expected\nnothing.wav: there is no such file\n',
    );
  });

  test('people get a page of 80 columns with three or four figures', async () => {
    const file = put(
      'page.wav',
      exactWav(5120, sine(5120, 51200, [10, 50, 0]), sine(5120, 51200, [1, 100, 0])),
    );
    const ran = await run(['analyse', '--samples-in', 'm/s2', '--band', '10..1000:velocity', file], {
      workingFolder: folder,
    });
    expect(ran.status).toBe(0);
    expect(Math.max(...ran.out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
    expect(ran.out).toContain('10..1000:velocity  10 Hz to 1000 Hz   22.5');
    expect(ran.out).toContain('24 averages, worth 22.8 independent');
    expect(ran.out).toMatch(/^Channel 2, acceleration in m\/s²$/m);
  });
});

describe('with a site file', () => {
  test('the points that take the file by name are analysed, also out of the archive', async () => {
    const own = mkdtempSync(join(folder, 'site-'));
    writeFileSync(join(own, 'site.yaml'), siteText);
    mkdirSync(join(own, 'data/archive/2026/03/02'), { recursive: true });
    const name = 'data/archive/2026/03/02/blower-1_20260302T060000Z.wav~1a2b3c4d';
    writeFileSync(
      join(own, name),
      exactWav(2560, sine(2560, 5120, [1, 100, 0]), sine(2560, 5120, [2, 100, 0])),
    );
    const ran = await run(['analyse', '--json', name], { workingFolder: own });
    expect(ran.err).toBe('');
    const answer = JSON.parse(ran.out) as Analysed & { start: string; start_origin: string };
    expect(answer).toMatchObject({ start: '2026-03-02T06:00:00.000Z', start_origin: 'file-name' });
    expect(answer.channels.map(({ machine, point }) => `${machine}/${point}`)).toEqual([
      'blower-1/de-h',
      'blower-1/nde-h',
    ]);
    expect(answer.channels[1]?.bands[0]).toMatchObject({ band: 'overall', unit: 'mm/s', detector: 'rms' });
    expect(answer.channels[1]?.bands[0]?.level).toBeCloseTo((1000 * Math.SQRT2) / (2 * Math.PI * 100), 2);
  });

  test('the speed comes from the pulse channel; where it moves there is a spectrum over orders as well', async () => {
    const own = mkdtempSync(join(folder, 'site-'));
    const pulses = '    speed:\n      pulse_channel: 3\n    points:\n      - id: de-h';
    writeFileSync(join(own, 'site.yaml'), siteText.replace('    points:\n      - id: de-h', pulses));
    // 22.5 to 27.5 Hz within 8 s.
    const turnsAt = (t: number) => 22.5 * t + 0.3125 * t * t;
    const shaft = Float64Array.from({ length: 8 * 2560 }, (_, n) =>
      Math.sin(2 * Math.PI * 3 * turnsAt(n / 2560)),
    );
    const marks = pulseChannel({ sampleRateHz: 2560, seconds: 8, turnsAt }, seededRandom(1));
    writeFileSync(join(own, 'blower-1_20260302T060000Z.wav'), exactWav(2560, shaft, shaft, marks));
    const asked = ['analyse', 'blower-1_20260302T060000Z.wav'];
    const ran = await run([...asked, '--json', '--spectrum'], { workingFolder: own });
    const [channel] = JSON.parse(ran.out).channels;
    expect(channel.speed).toEqual({
      rpm: expect.closeTo(1500, -1),
      origin: 'pulses',
      uncertainty_rpm: expect.any(Number),
      names_lines: false,
      lowest_rpm: expect.closeTo(1357, -1),
      highest_rpm: expect.closeTo(1643, -1),
      in_spectrum: null,
    });
    expect(channel.orders).toMatchObject({
      mean_rpm: expect.closeTo(1500, -1),
      averages: expect.any(Number),
    });
    expect(channel.orders.peaks[0].order).toBeCloseTo(3, 2);
    expect(channel.orders.peaks[0].level).toBeCloseTo(Math.SQRT1_2, 2);
    expect(channel.orders.spectrum).toMatchObject({ unit: '(m/s²)²/order' });
    expect(channel.quality.map(({ flag }: { flag: string }) => flag)).toContain('transient');
    const people = (await run(asked, { workingFolder: own })).out.replace(/\s+/g, ' ');
    expect(people).toMatch(
      /speed 1[45]\d\d(\.\d)? rpm ± \S+, from its pulses; between 13\d\d and 16\d\d rpm/,
    );
    expect(people).toContain('orders from samples at equal angles, for the speed moved');
    expect(people).toContain('peak over orders, Hz');
  });

  test('a name that no point takes is answered with the nearest pattern; a channel that is not there too', async () => {
    const own = mkdtempSync(join(folder, 'site-'));
    writeFileSync(join(own, 'site.yaml'), siteText);
    const mono = exactWav(2560, sine(2560, 5120, [1, 100, 0]));
    writeFileSync(join(own, 'blower_1.wav'), mono);
    writeFileSync(join(own, 'blower-1_x.wav'), mono);
    const stranger = await run(['analyse', 'blower_1.wav'], { workingFolder: own });
    expect(stranger).toMatchObject({ status: 1, out: '' });
    expect(stranger.err).toContain(
      'blower_1.wav: no point of the site file takes a file of this name; nearest pattern blower-1_<any>.wav',
    );
    const missing = await run(['analyse', 'blower-1_x.wav'], { workingFolder: own });
    expect(missing.status).toBe(1);
    expect(missing.err).toBe('blower-1_x.wav: blower-1/nde-h: the file has 1 channels, none number 2\n');
    expect(missing.out).toContain('Channel 1: blower-1/de-h');
  });

  test('a wrong site file is exit status 2, with the line', async () => {
    const own = mkdtempSync(join(folder, 'site-'));
    writeFileSync(join(own, 'site.yaml'), siteText.replace('10 Hz', '10'));
    const ran = await run(['analyse', 'x.wav'], { workingFolder: own });
    expect(ran.status).toBe(2);
    expect(ran.err).toMatch(/site\.yaml:22:\d+: .*write: from: 10 Hz/);
  });
});

test.each([
  [['--samples-in', 'kg'], /--samples-in: 'kg' is no unit of samples/],
  [
    ['--samples-in', 'g', '--sensitivity', '100 mV/g'],
    /--sensitivity is for samples in V, --samples-in says g/,
  ],
  [['--samples-in', 'V', '--sensitivity', '100 pC/g'], /charge of a sensor/],
  [['--samples-in', 'g', '--window', 'han'], /no window .*write: --window 'hann'/],
  [['--samples-in', 'g', '--overlap', '99'], /no overlap from 0 to 95/],
  [['--samples-in', 'g', '--segment', '4000'], /a power of two .*write: --segment '4096'/],
  [['--samples-in', 'g', '--band', '10-1000'], /FROM\.\.TO\[:QUANTITY\]/],
  [['--samples-in', 'g', '--band', '1000..10'], /does not end above its begin/],
  [['--samples-in', 'g', '--band', '10..1000:velocty'], /no quantity; velocity\?/],
  [['--samples-in', 'um', '--band', '10..1000:velocity'], /--band 10\.\.1000:velocity: /],
  [['--samples-in', 'g', '--full-scale', '0'], /not above 0/],
  [['--samples-in', 'g', '--site', 'site.yaml'], /without a site file; leave out either/],
])('options that are wrong: %j', async (options, message) => {
  const ran = await run(['analyse', ...options, 'x.wav'], { workingFolder: folder });
  expect(ran.status).toBe(2);
  expect(ran.err).toMatch(message);
  expect(ran.err.trimEnd().split('\n')).toHaveLength(1);
});

test('a level over a band that is narrower than the window allows is told', async () => {
  const file = put('narrow.wav', exactWav(2560, sine(2560, 5120, [1, 100, 0])));
  const ran = await run(['analyse', '--samples-in', 'm/s2', '--segment', '512', '--band', '99..105', file], {
    workingFolder: folder,
  });
  expect(ran.status).toBe(0);
  expect(ran.err).toContain("note: band '99..105' of channel 1 is 1.2 lines of 5 Hz wide, hann needs 3");
});

test('a file that a person names by a link is read', async () => {
  const file = put('whole.wav', exactWav(2560, sine(2560, 5120, [1, 100, 0])));
  symlinkSync(join(folder, file), join(folder, 'link.wav'));
  expect((await json('--samples-in', 'm/s2', 'link.wav')).file).toBe('link.wav');
});

test('as a process of its own: exit status, output, and a reader who has seen enough', async () => {
  const file = put('process.wav', exactWav(2560, sine(2560, 5120, [1, 100, 0])));
  const start = new URL('../../src/cli/start.ts', import.meta.url).pathname;
  const at = { cwd: folder };
  const good = await promisify(execFile)(
    process.execPath,
    [start, 'analyse', '--json', '--samples-in', 'g', file],
    at,
  );
  expect((JSON.parse(good.stdout) as Analysed).channels).toHaveLength(1);
  const bad = promisify(execFile)(process.execPath, [start, 'analyse', 'nothing.wav'], at);
  await expect(bad).rejects.toMatchObject({ code: 1, stderr: 'nothing.wav: there is no such file\n' });
  const piped = promisify(execFile)(
    '/bin/sh',
    [
      ...[
        '-c',
        `'${process.execPath}' '${start}' analyse --spectrum --json --samples-in g --segment 4096 ${file} ${file} ${file} | head -c 10; echo`,
      ],
    ],
    at,
  );
  await expect(piped).resolves.toMatchObject({ stderr: '' });
});
