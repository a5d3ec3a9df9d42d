import { describe, expect, it } from 'vitest';
import { sidecarNameOf } from '../../src/acquisition/file-name.ts';
import { recordingIdentity } from '../../src/acquisition/identity.ts';
import type { Sidecar } from '../../src/acquisition/recording.ts';
import { appliedSignal, scalingOf } from '../../src/acquisition/scaling.ts';
import { largestSidecarBytes, parseSidecar } from '../../src/acquisition/sidecar.ts';
import type { SignalSettings } from '../../src/config/site.ts';

const read = (text: string) => parseSidecar(new TextEncoder().encode(text));

function understood(text: string): Sidecar {
  const answer = read(text);
  if ('reason' in answer) throw new Error(answer.reason);
  return answer;
}

describe('a sidecar', () => {
  it('gives start, speed, load, the word on running, and how samples are scaled', () => {
    const sidecar = understood(`\ufeff{
      "start": "2026-11-03T09:30:00+01:00", "speed_rpm": 1480.5, "load_percent": 75, "running": true,
      "channels": { "1": { "samples_in": "V", "full_scale": "5000 mV", "sensitivity": "100 mV/g" },
                    "pump": { "full_scale": 2 } }
    }`);
    expect(sidecar).toMatchObject({
      start: { ms: Date.UTC(2026, 10, 3, 8, 30), zoned: true, origin: 'sidecar' },
      speedRpm: 1480.5,
      loadPercent: 75,
      running: true,
    });
    expect(sidecar.channels['1'].samplesIn).toMatchObject({ quantity: 'voltage', inSi: 1 });
    expect(sidecar.channels['1'].fullScale).toBeCloseTo(5, 12);
    expect(sidecar.channels['1'].sensitivity).toBeCloseTo(0.1 / 9.80665, 12);
    expect(sidecar.channels.pump).toEqual({ fullScale: 2 });
  });

  it('may leave everything out', () => {
    const nothing = { start: null, speedRpm: null, loadPercent: null, running: null, channels: {} };
    expect(understood('{}')).toEqual(nothing);
    expect(understood('{"start":null,"speed_rpm":null}')).toEqual(nothing);
  });

  it.each([
    ['', /no JSON/],
    ['[]', /the whole is no object/],
    ['"text"', /the whole is no object/],
    ['{"speed": 1480}', /"speed" is not known; known are start, speed_rpm/],
    ['{"speed_rpm": "1480"}', /speed_rpm: "1480" is no number/],
    ['{"speed_rpm": 1e999}', /speed_rpm: Infinity is no number/],
    ['{"speed_rpm": -1}', /speed_rpm: -1/],
    ['{"running": 1}', /running: 1 is neither true nor false/],
    ['{"start": 1762160000}', /start: no date and time; write it as/],
    ['{"start": "yesterday"}', /start/],
    ['{"channels": []}', /channels is no object/],
    ['{"channels": {"1": {"gain": 2}}}', /channels.1: "gain" is not known/],
    ['{"channels": {"1": {"samples_in": "furlong"}}}', /channels.1.samples_in: "furlong" is no unit/],
    ['{"channels": {"1": {"samples_in": "Hz"}}}', /no unit of samples/],
    ['{"channels": {"1": {"sensitivity": 100}}}', /100 has no unit; write it as "100 mV\/g"/],
    ['{"channels": {"1": {"sensitivity": "100 pC/g"}}}', /charge/],
    ['{"channels": {"1": {"full_scale": "10 V"}}}', /give samples_in beside it/],
    ['{"channels": {"1": {"samples_in": "V", "full_scale": 0}}}', /no full scale/],
    ['{"channels": {"1": {"samples_in": "V", "full_scale": "10 g"}}}', /full_scale/],
    ['{"channels": {"1": {"samples_in": {"a": {"b": {}}}}}}', /nested deeper than 4/],
    ['{"__proto__": {"speed_rpm": 1}}', /__proto__/],
    ['{"channels": {"__proto__": {"full_scale": 2}}}', /__proto__/],
    ['{"channels": {"\\u001b[2J": 1}}', /channels\.\\x1b\[2J/],
    ['{"speed_rpm": 1480', /no JSON/],
    ['['.repeat(60_000), /nested deeper/],
    [`{"start": "${'x'.repeat(largestSidecarBytes)}"}`, /at most 65536 are read/],
  ])('reading %s is refused with the reason', (text, reason) => {
    expect(read(text)).toEqual({ reason: expect.stringMatching(reason) });
  });

  it('that is not UTF-8 is refused; brackets in its texts are no nesting', () => {
    expect(parseSidecar(Uint8Array.of(0x7b, 0xff, 0x7d))).toMatchObject({
      reason: expect.stringContaining('UTF-8'),
    });
    expect(read('{"channels": {"[[[[{{{{\\"": {}}}')).not.toHaveProperty('reason');
  });

  it('is named after its recording', () => {
    expect(sidecarNameOf('blower-1_2026.wav')).toBe('blower-1_2026.json');
    expect(sidecarNameOf('a.b.csv')).toBe('a.b.json');
    expect(sidecarNameOf('noending')).toBe('noending.json');
    expect(sidecarNameOf('a.wav~1a2b3c4d')).toBe('a~1a2b3c4d.json');
  });
});

const volts = { text: 'V', quantity: 'voltage', inSi: 1 } as const;
const millivolts = { text: 'mV', quantity: 'voltage', inSi: 1e-3 } as const;
const gravity = { text: 'g', quantity: 'acceleration', inSi: 9.80665 } as const;
const behindSensor: SignalSettings = {
  samplesIn: volts,
  fullScale: 10,
  sensitivity: 0.1 / 9.80665,
  sensitivityText: '100 mV/g',
};

describe('the way from sample to SI', () => {
  it('goes through full scale, unit and sensitivity for integers', () => {
    // 0.01 of 10 V is 0.1 V, at 100 mV/g 1 g.
    const scaling = scalingOf('integer', 'acceleration', behindSensor);
    expect(scaling).toMatchObject({ voltsPerSample: 10, signal: behindSensor });
    expect('siPerSample' in scaling && 0.01 * scaling.siPerSample).toBeCloseTo(9.80665, 10);
  });

  it('takes numbers as they stand, whatever the full scale', () => {
    const scaling = scalingOf('number', 'acceleration', behindSensor);
    expect('siPerSample' in scaling && 0.1 * scaling.siPerSample).toBeCloseTo(9.80665, 10);
    const inG = { samplesIn: gravity, fullScale: null, sensitivity: null, sensitivityText: null };
    expect(scalingOf('number', 'acceleration', inG)).toMatchObject({
      siPerSample: 9.80665,
      voltsPerSample: null,
    });
    expect(scalingOf('integer', 'acceleration', { ...inG, fullScale: 50 })).toMatchObject({
      siPerSample: 490.3325,
    });
  });

  it('is refused where unit and quantity do not fit', () => {
    const inG = { samplesIn: gravity, fullScale: null, sensitivity: null, sensitivityText: null };
    expect(scalingOf('number', 'velocity', inG)).toMatchObject({
      reason: expect.stringContaining('give a sensitivity'),
    });
    expect(scalingOf('number', 'acceleration', { ...inG, sensitivity: 1 })).toMatchObject({
      reason: expect.stringContaining('not in V'),
    });
    expect(scalingOf('integer', 'acceleration', { ...behindSensor, sensitivity: null })).toHaveProperty(
      'reason',
    );
  });

  it('follows the sidecar where it says something, and the site file where not', () => {
    expect(appliedSignal(behindSensor, undefined)).toBe(behindSensor);
    expect(appliedSignal(behindSensor, { fullScale: 5 })).toEqual({ ...behindSensor, fullScale: 5 });
    // The site's 10 V are 10,000 of the sidecar's mV.
    expect(appliedSignal(behindSensor, { samplesIn: millivolts })).toEqual({
      ...behindSensor,
      samplesIn: millivolts,
      fullScale: 10_000,
    });
    // Samples in g need neither the volts' full scale nor a sensitivity.
    expect(appliedSignal(behindSensor, { samplesIn: gravity })).toMatchObject({
      fullScale: null,
      sensitivity: null,
    });
  });
});

describe('the identity of a recording', () => {
  const file = {
    contentSha256: 'aa',
    sidecarSha256: null,
    source: 'blower-1_<any>.wav',
    statedMs: 1000,
    path: 'blower-1_a.wav',
    modifiedMs: 5,
  };
  const identity = recordingIdentity(file);

  it('is content, sidecar, source and stated start', () => {
    for (const change of [
      { contentSha256: 'ab' },
      { sidecarSha256: 'aa' },
      { source: 'x' },
      { statedMs: 1001 },
    ]) {
      expect(recordingIdentity({ ...file, ...change })).not.toBe(identity);
    }
    expect(recordingIdentity({ ...file, path: 'other', modifiedMs: 6 })).toBe(identity);
    expect(identity).toMatch(/^[0-9a-f]{64}$/);
  });

  it('is also name and time of change where no start is stated', () => {
    const unstated = { ...file, statedMs: null };
    const unstatedIdentity = recordingIdentity(unstated);
    expect(recordingIdentity(unstated)).toBe(unstatedIdentity);
    expect(recordingIdentity({ ...unstated, path: 'other' })).not.toBe(unstatedIdentity);
    expect(recordingIdentity({ ...unstated, modifiedMs: 6 })).not.toBe(unstatedIdentity);
    expect(unstatedIdentity).not.toBe(recordingIdentity({ ...file, statedMs: 0 }));
  });
});
