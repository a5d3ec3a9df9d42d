import { describe, expect, it } from 'vitest';
import { runningSpeed, type SpeedQuestion } from '../../src/manipulation/running-speed.ts';
import type { TurnSpeed } from '../../src/signal/pulse-speed.ts';
import { seededRandom } from '../signal/random.ts';
import { speedSpectrum } from '../signal/speed-trials.ts';

/** The spectrum of a machine whose shaft turns at so many Hz. */
const spectraAt = (hz: number, harmonics = [1, 2, 3, 4, 5, 6], nominalHz = hz) => [
  speedSpectrum(
    { speedHz: hz, nominalHz, tones: harmonics.map((n) => ({ hz: n * hz, amplitude: 0.8 })) },
    seededRandom(7),
  ),
];
const noSpectra = [speedSpectrum({ speedHz: 24, nominalHz: 24, tones: [] }, seededRandom(8))];

const turning = (meanHz: number, lowestHz = meanHz, highestHz = meanHz): TurnSpeed => ({
  meanHz,
  uncertaintyHz: 1e-4 * meanHz,
  lowestHz,
  highestHz,
  turnTimes: Float64Array.of(0, 1, 2, 3),
  missed: 0,
  doubled: 0,
});

const answer = (question: Partial<SpeedQuestion>) =>
  runningSpeed({ sidecarRpm: null, nominalHz: null, findWithinPercent: 5, ...question });
const flags = (question: Partial<SpeedQuestion>) => answer(question).findings.map(({ flag }) => flag);

describe('the running speed of a recording', () => {
  it('is the sidecar’s, then that of the pulses, then that in the spectrum, then the nominal one', () => {
    const all = { sidecarRpm: 1440, pulses: turning(24), spectra: spectraAt(24), nominalHz: 24.5 };
    expect(answer(all)).toMatchObject({
      speed: { rpm: 1440, origin: 'sidecar', uncertaintyRpm: expect.closeTo(7.2, 9) },
    });
    expect(answer({ ...all, sidecarRpm: null })).toMatchObject({
      speed: { rpm: 1440, origin: 'pulses', uncertaintyRpm: expect.closeTo(0.144, 9) },
    });
    const found = answer({ ...all, sidecarRpm: null, pulses: null }).speed;
    expect(found).toMatchObject({ origin: 'spectrum', usableForNames: true });
    expect(Math.abs((found?.rpm ?? 0) - 1440)).toBeLessThan(1);
    expect(found?.inSpectrum).toMatchObject({ rpm: expect.closeTo(1440, 0), score: expect.any(Number) });
    expect(answer({ nominalHz: 24.5, spectra: noSpectra }).speed).toMatchObject({
      rpm: 1470,
      origin: 'nominal',
      uncertaintyRpm: expect.closeTo(44.1, 9),
      usableForNames: true,
      inSpectrum: null,
    });
    expect(answer({ spectra: spectraAt(24) })).toEqual({ speed: null, findings: [] });
  });

  it('is not looked for where the site file says never', () => {
    const never = { nominalHz: 24.5, spectra: spectraAt(24), findWithinPercent: null };
    expect(answer(never)).toMatchObject({ speed: { rpm: 1470, origin: 'nominal' }, findings: [] });
    expect(answer({ ...never, sidecarRpm: 1200 })).toMatchObject({ speed: { rpm: 1200 }, findings: [] });
  });

  it('shows the range over which the pulses moved; more than 5 % of it is transient', () => {
    expect(answer({ pulses: turning(24, 23.8, 24.3) })).toMatchObject({
      speed: { rangeRpm: { lowest: expect.closeTo(1428, 6), highest: expect.closeTo(1458, 6) } },
      findings: [],
    });
    const moved = answer({ pulses: turning(24, 22, 26) });
    expect(moved.findings).toEqual([
      { flag: 'transient', detail: expect.stringContaining('between 1320 rpm and 1560 rpm') },
    ]);
  });

  it('of a machine at a standstill is 0, and nothing is doubtful about it', () => {
    expect(answer({ sidecarRpm: 0, nominalHz: 24, spectra: noSpectra })).toMatchObject({
      speed: { rpm: 0, origin: 'sidecar', uncertaintyRpm: 0 },
      findings: [],
    });
  });
});

describe('a declared speed', () => {
  it('that the spectrum bears out names lines, and says what the spectrum shows', () => {
    const borneOut = answer({ sidecarRpm: 1442, spectra: spectraAt(24) });
    expect(borneOut).toMatchObject({ speed: { rpm: 1442, usableForNames: true }, findings: [] });
    expect(Math.abs((borneOut.speed?.inSpectrum?.rpm ?? 0) - 1440)).toBeLessThan(1);
  });

  it('of the sidecar that the spectrum contradicts is flagged and names nothing', () => {
    for (const sidecarRpm of [1460, 1425, 1700, 1250]) {
      const contradicted = answer({ sidecarRpm, spectra: spectraAt(24) });
      expect(contradicted.speed).toMatchObject({ rpm: sidecarRpm, origin: 'sidecar', usableForNames: false });
      expect(contradicted.findings).toEqual([
        {
          flag: 'speed-doubtful',
          detail: `the sidecar says ${sidecarRpm} rpm, the spectrum shows the harmonics of 1440 rpm; no line is named by it`,
        },
      ]);
    }
  });

  it('of the site file likewise, where the shaft is seen farther off than it is looked for', () => {
    const far = answer({ nominalHz: 21, spectra: spectraAt(24) });
    expect(far.speed).toMatchObject({ rpm: 1260, origin: 'nominal', usableForNames: false });
    expect(far.findings).toMatchObject([{ flag: 'speed-doubtful' }]);
  });

  it('is not contradicted by a spectrum that shows too little, or two speeds', () => {
    expect(flags({ sidecarRpm: 1250, spectra: noSpectra })).toEqual([]);
    expect(flags({ sidecarRpm: 1250, spectra: spectraAt(24, [1, 2, 3]) })).toEqual([]);
    expect(flags({ sidecarRpm: 1250, spectra: spectraAt(24, [2, 4, 6, 8, 10]) })).toEqual([]);
    expect(flags({ sidecarRpm: 1250, spectra: spectraAt(20.83).concat(spectraAt(24)) })).toEqual([]);
  });

  it('that the pulses contradict is flagged, and so are pulses that give no speed', () => {
    expect(answer({ sidecarRpm: 1440, pulses: turning(48) })).toMatchObject({
      speed: { rpm: 1440, usableForNames: false },
      findings: [{ flag: 'speed-doubtful', detail: expect.stringContaining('its pulses show 2880 rpm') }],
    });
    // A machine that has a pulse channel need not turn at its nominal speed.
    const silent = answer({ nominalHz: 24, pulses: { refused: 'no pulses' }, spectra: noSpectra });
    expect(silent.speed).toMatchObject({ rpm: 1440, origin: 'nominal', usableForNames: false });
    const blind = answer({ nominalHz: 24, pulses: { refused: 'no pulses' }, spectra: spectraAt(24) });
    expect(blind.speed?.origin).toBe('spectrum');
    expect(blind.findings).toEqual([
      { flag: 'speed-doubtful', detail: 'no speed from the pulse channel: no pulses' },
    ]);
  });
});
