import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { isRefusal, type Sidecar } from '../../src/acquisition/recording.ts';
import { wavBytes } from '../../src/cli/demo/write-wav.ts';
import { nothingSaid } from '../../src/config/sample-layout.ts';
import type { SpeedSettings } from '../../src/config/speed-settings.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { analyseFile } from '../../src/service/analyse-file.ts';
import { type PointTask, readRecording } from '../../src/service/read-recording.ts';
import { testBand, testPoint } from '../manipulation/point.ts';
import { pulseChannel } from '../signal/pulse-channel.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';

const sampleRateHz = 5120;
const seconds = 20;
const frames = seconds * sampleRateHz;

/** A shaft by the turns it has made; acceleration of its harmonics as parts of full scale, over noise. */
interface Shaft {
  readonly turnsAt: (time: number) => number;
  readonly harmonics: Readonly<Record<number, number>>;
}

const steady = (hz: number) => (t: number) => hz * t;
/** 22.5 to 27.5 Hz: 20 % about 25 Hz. */
const sweep = (t: number) => 22.5 * t + 0.125 * t * t;

function vibration({ turnsAt, harmonics }: Shaft, seed = 1): Float64Array {
  const noise = gaussianNoise(seededRandom(seed), frames, 2e-3);
  return noise.map((value, n) => {
    const turns = turnsAt(n / sampleRateHz);
    return Object.entries(harmonics).reduce(
      (sum, [order, amplitude]) =>
        sum + amplitude * Math.sin(2 * Math.PI * Number(order) * turns + Number(order)),
      value,
    );
  });
}

const pulses = (turnsAt: Shaft['turnsAt'], pulsesPerTurn = 1) =>
  pulseChannel(
    { sampleRateHz, seconds, turnsAt, pulsesPerTurn, duty: 0.1, low: 0.02, high: 0.5 },
    seededRandom(2),
  );

const bands = [
  testBand('1x', 'acceleration', 0.8, 1.2, true),
  testBand('3x', 'acceleration', 2.8, 3.2, true),
  testBand('3x-velocity', 'velocity', 2.8, 3.2, true),
  testBand('hz', 'acceleration', 300, 900),
];
const pulseSettings = { channel: 2, pulsesPerTurn: 1, thresholdV: null };

function task(
  speed: Partial<SpeedSettings>,
  changes: Partial<PointTask> = {},
  id = 'de-h',
  channel = 1,
): PointTask {
  return {
    point: testPoint({ id, channel, bands }),
    nominalHz: 25.2,
    speed: { findWithinPercent: 5, pulses: null, ...speed },
    ...changes,
  };
}

const sidecarOf = (speedRpm: number): Sidecar => ({
  start: null,
  speedRpm,
  loadPercent: null,
  running: null,
  channels: {},
});

function read(
  channels: readonly Float64Array[],
  tasks: readonly PointTask[],
  sidecar: Sidecar | null = null,
): readonly Measurement[] {
  const source = bytesSource(wavBytes(channels, sampleRateHz));
  const header = wavReader.header(source);
  if (isRefusal(header)) throw new Error(header.reason);
  const answer = readRecording(source, wavReader, header, sidecar, tasks);
  if (isRefusal(answer)) throw new Error(answer.reason);
  expect(answer.missing).toEqual([]);
  return answer.measurements;
}

const levelOf = ({ levels }: Measurement, id: string) => {
  const found = levels.find(({ bandId }) => bandId === id);
  if (found === undefined) throw new Error(`no level of ${id}`);
  return found;
};

describe('the running speed of a recording', () => {
  it('comes from its pulse channel, and bands and peaks in orders follow it', () => {
    const turnsAt = steady(24.37);
    const [one] = read(
      [vibration({ turnsAt, harmonics: { 1: 0.3, 3: 0.1 } }), pulses(turnsAt)],
      [task({ pulses: pulseSettings })],
    );
    expect(one.speed).toMatchObject({ origin: 'pulses', usableForNames: true });
    expect(Math.abs((one.speed?.rpm ?? 0) / (60 * 24.37) - 1)).toBeLessThan(1e-4);
    expect(levelOf(one, '3x').level).toBeCloseTo(0.1 / Math.SQRT2, 3);
    expect(levelOf(one, '3x').fromHz).toBeCloseTo(2.8 * 24.37, 2);
    expect(levelOf(one, '3x').exceededBy80Percent).toBeCloseTo(0.1 / Math.SQRT2, 2);
    expect(one.peaks[0].order).toBeCloseTo(1, 3);
    expect(one.quality).toEqual([]);
    expect(one.orders).toBeNull();
  });

  it('is found in the spectra of all points of a machine together', () => {
    const turnsAt = steady(24.4);
    const shafts: Shaft[] = [
      { turnsAt, harmonics: { 1: 0.3, 4: 0.1 } },
      { turnsAt, harmonics: { 2: 0.05, 3: 0.1, 5: 0.1 } },
    ];
    const both = read(
      shafts.map((shaft) => vibration(shaft)),
      [task({}), task({}, {}, 'nde-h', 2)],
    );
    for (const one of both) {
      expect(one.speed?.origin).toBe('spectrum');
      expect(Math.abs((one.speed?.rpm ?? 0) / (60 * 24.4) - 1)).toBeLessThan(1e-3);
    }
    expect(levelOf(both[1], '3x').level).toBeCloseTo(0.1 / Math.SQRT2, 3);
    const never = read(
      shafts.map((shaft) => vibration(shaft)),
      [task({ findWithinPercent: null }), task({ findWithinPercent: null }, {}, 'nde-h', 2)],
    );
    expect(never[0].speed).toMatchObject({ origin: 'nominal', rpm: 1512 });
  });

  it('as a sidecar says it, is flagged and names nothing where the recording shows another', () => {
    const harmonics = { 1: 0.2, 2: 0.1, 3: 0.1, 4: 0.05, 5: 0.1 };
    const turnsAt = steady(24.4);
    const [doubted] = read([vibration({ turnsAt, harmonics })], [task({})], sidecarOf(1500));
    expect(doubted.speed).toMatchObject({ rpm: 1500, origin: 'sidecar', usableForNames: false });
    expect(doubted.quality).toEqual([
      {
        flag: 'speed-doubtful',
        detail: expect.stringContaining('the sidecar says 1500 rpm, the spectrum shows'),
      },
    ]);
    const [byPulses] = read(
      [vibration({ turnsAt, harmonics }), pulses(turnsAt)],
      [task({ pulses: { ...pulseSettings, pulsesPerTurn: 2 } })],
      sidecarOf(1464),
    );
    expect(byPulses.speed).toMatchObject({ rpm: 1464, usableForNames: false });
    expect(byPulses.quality[0].detail).toContain('its pulses show 732 rpm');
  });

  it('falls back, and says so, where the pulse channel is not there or shows nothing', () => {
    const turnsAt = steady(24.4);
    const shaft = vibration({ turnsAt, harmonics: { 1: 0.2, 2: 0.1, 3: 0.1 } });
    const [absent] = read([shaft], [task({ pulses: { ...pulseSettings, channel: 7 } })]);
    expect(absent.speed?.origin).toBe('spectrum');
    expect(absent.quality[0]).toEqual({
      flag: 'speed-doubtful',
      detail: 'no speed from the pulse channel: the file has 1 channels, none number 7',
    });
    const [still] = read(
      [gaussianNoise(seededRandom(3), frames, 1e-3), new Float64Array(frames)],
      [task({ pulses: pulseSettings })],
    );
    expect(still.speed?.origin).toBe('nominal');
    expect(still.quality.at(-1)?.detail).toContain('does not move');
  });

  it('takes a threshold in volts by the full scale of the recordings', () => {
    const turnsAt = steady(24.4);
    // 0.02 to 0.5 of 10 V; teeth of 0.1 lie beneath.
    const teeth = pulseChannel(
      { sampleRateHz, seconds, turnsAt, pulsesPerTurn: 6, duty: 0.3, low: 0, high: 0.15 },
      seededRandom(5),
    );
    const mark = pulses(turnsAt).map((value, n) => value + teeth[n]);
    const point = testPoint({
      bands: [],
      signal: {
        samplesIn: { text: 'V', quantity: 'voltage', inSi: 1 },
        fullScale: 10,
        sensitivity: 0.1,
        sensitivityText: '100 mV/(m/s²)',
      },
    });
    const settings = (thresholdV: number, pulsesPerTurn: number) =>
      task({ pulses: { channel: 2, pulsesPerTurn, thresholdV } }, { point });
    const shaft = vibration({ turnsAt, harmonics: { 1: 0.01 } });
    expect(read([shaft, mark], [settings(4, 1)])[0].speed?.rpm).toBeCloseTo(1464, 0);
    expect(read([shaft, teeth], [settings(0.8, 6)])[0].speed?.rpm).toBeCloseTo(1464, 0);
    expect(read([shaft, mark], [settings(9, 1)])[0].speed?.origin).not.toBe('pulses');
  });
});

describe('a shaft whose speed moves by a fifth within the recording', () => {
  const amplitude = 0.2;
  const channels = [vibration({ turnsAt: sweep, harmonics: { 3: amplitude } }), pulses(sweep)];
  const [measured] = read(channels, [task({ pulses: pulseSettings })]);
  const { fingerprint } = levelOf(measured, '3x');

  it('has its levels in orders from equal angles: 3x within half a percent', () => {
    expect(Math.abs(levelOf(measured, '3x').level / (amplitude / Math.SQRT2) - 1)).toBeLessThan(5e-3);
    expect(levelOf(measured, '1x').level).toBeLessThan(0.01);
    expect(levelOf(measured, '3x').exceededBy80Percent).toBeCloseTo(amplitude / Math.SQRT2, 2);
  });

  it('has its velocity by the frequency of each moment', () => {
    // 20 to 30 Hz with one and the same velocity: an acceleration that grows with the speed.
    const turnsAt = (t: number) => 20 * t + 0.25 * t * t;
    const velocity = 5e-4;
    const samples = Float64Array.from({ length: frames }, (_, n) => {
      const t = n / sampleRateHz;
      const omega = 2 * Math.PI * 3 * (20 + 0.5 * t);
      return velocity * Math.SQRT2 * omega * Math.cos(2 * Math.PI * 3 * turnsAt(t));
    });
    const [one] = read([samples, pulses(turnsAt)], [task({ pulses: pulseSettings })]);
    // By the mean speed alone it would be 2 % too high.
    expect(Math.abs(levelOf(one, '3x-velocity').level / velocity - 1)).toBeLessThan(4e-3);
  });

  it('shows a line at 3x in the spectrum over orders, where the plain one has none of half its level', () => {
    const [highest] = measured.orders?.peaks ?? [];
    expect(highest).toMatchObject({ kind: 'tone', order: expect.closeTo(3, 3) });
    expect(Math.abs(highest.level / (amplitude / Math.SQRT2) - 1)).toBeLessThan(5e-3);
    expect(measured.orders).toMatchObject({
      meanRpm: expect.closeTo(1500, -1),
      averages: expect.any(Number),
    });
    const tones = measured.peaks.filter(
      ({ kind, order }) => kind === 'tone' && Math.abs((order ?? 0) - 3) < 1,
    );
    expect(tones.every(({ level }) => level < 0.5 * highest.level)).toBe(true);
  });

  it('leaves its bands in Hz as they are, its series going on, and is flagged transient', () => {
    const [still] = read(
      [vibration({ turnsAt: steady(25), harmonics: { 3: amplitude } }), pulses(steady(25))],
      [task({ pulses: pulseSettings })],
    );
    expect(levelOf(still, '3x').fingerprint).toBe(fingerprint);
    expect(levelOf(measured, 'hz').level).toBeCloseTo(levelOf(still, 'hz').level, 4);
    expect(measured.quality.map(({ flag }) => flag)).toContain('transient');
    expect(measured.levels.map(({ bandId }) => bandId)).toEqual(bands.map(({ id }) => id));
  });

  it('is read once more for it, its hash made once', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'humledger-'));
    try {
      const file = join(folder, 'sweep.wav');
      const bytes = wavBytes(channels, sampleRateHz);
      writeFileSync(file, bytes);
      const answer = await analyseFile(file, statSync(file).size, {
        layout: nothingSaid,
        planFor: () => ({
          points: [task({ pulses: pulseSettings })],
          sidecar: null,
          clock: { kind: 'utc' },
          siteZone: 'UTC',
          startInName: null,
        }),
      });
      if ('reason' in answer) throw new Error(answer.reason);
      expect(answer.sha256).toBe(createHash('sha256').update(bytes).digest('hex'));
      expect(answer.measurements[0]).toEqual(measured);
    } finally {
      rmSync(folder, { recursive: true });
    }
  });

  it('is measured by the turns of the stretch that is measured, where its start is skipped', () => {
    const settings = task({ pulses: pulseSettings });
    const skipping = { ...settings, point: testPoint({ bands }, { skipStartS: 4 }) };
    const [late] = read(channels, [skipping]);
    expect(Math.abs(levelOf(late, '3x').level / (amplitude / Math.SQRT2) - 1)).toBeLessThan(5e-3);
    expect(late.orders?.meanRpm).toBeCloseTo(1530, -1);
    expect(late.orders?.peaks[0]).toMatchObject({ kind: 'tone', order: expect.closeTo(3, 3) });
  });
});
