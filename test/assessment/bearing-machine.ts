import { bearingMultiples } from '../../src/assessment/fault-frequencies.ts';
import type { RollingBearing } from '../../src/config/parts.ts';
import type { SeededRandom } from '../signal/random.ts';

/**
 * A machine with a rolling bearing of random size, recorded for 10.24 s at 25.6 kHz: harmonics of the shaft, noise that
 * the shaft may modulate, on some a gear mesh, and the impacts of one fault ringing a resonance. The declared speed is
 * wrong by 0.5 %; the cage slips by up to 1 %, and each spacing of two impacts varies by 1 %.
 */
export type SimulatedFault = 'outer race' | 'inner race' | 'rolling element';

export interface BearingMachine {
  readonly bearing: RollingBearing;
  readonly shaftHz: number;
  readonly declaredHz: number;
  readonly samples: Float64Array;
}

export const sampleRateHz = 25_600;
export const frames = 2 ** 18;

export interface MachineKind {
  readonly fault: SimulatedFault | null;
  /** One impact a turn, as of a rub or a loose foot: shaft harmonics throughout the envelope. */
  readonly oncePerTurn?: boolean;
  readonly bearing?: RollingBearing;
}

export function randomBearing(random: SeededRandom): RollingBearing {
  const ratio = 0.15 + 0.15 * random.uniform();
  const most = Math.floor(Math.PI / Math.asin(ratio));
  const rollingElements = Math.max(6, most - Math.floor(4 * random.uniform()));
  const contactAngleDeg = [0, 0, 15, 25, 40][Math.floor(5 * random.uniform())];
  return {
    kind: 'rolling-bearing',
    id: 'bearing',
    name: 'bearing',
    at: ['de-h'],
    shaft: 1,
    turningRing: 'inner',
    multiples: { ftf: null, bsf: null, bpfo: null, bpfi: null },
    geometry: { rollingElements, elementDiameter: ratio * 0.1, pitchDiameter: 0.1, contactAngleDeg },
  };
}

/** A bearing one of whose frequencies lies within 2 % of a harmonic of its shaft: one in about five is such. */
export function bearingNearHarmonic(random: SeededRandom): RollingBearing {
  for (;;) {
    const bearing = randomBearing(random);
    const { bsf, bpfo, bpfi } = bearingMultiples(bearing);
    const multiples = [bpfo ?? 0, bpfi ?? 0, 2 * (bsf ?? 0)];
    if (multiples.some((multiple) => Math.abs(multiple - Math.round(multiple)) < 0.02 * multiple))
      return bearing;
  }
}

export function bearingMachine(random: SeededRandom, kind: MachineKind): BearingMachine {
  const bearing = kind.bearing ?? randomBearing(random);
  const shaftHz = 10 + 40 * random.uniform();
  const samples = noiseOf(random, shaftHz);
  addShaft(samples, random, shaftHz);
  if (random.uniform() < 0.3) addMesh(samples, random, shaftHz);
  if (kind.oncePerTurn === true)
    addImpacts(samples, random, {
      hz: shaftHz,
      jitter: 0.001,
      levelDb: -12 + 12 * random.uniform(),
      modulationHz: null,
    });
  if (kind.fault !== null) addFault(samples, random, bearing, shaftHz, kind.fault);
  const declaredHz = shaftHz * (random.uniform() < 0.5 ? 1.005 : 0.995);
  return { bearing, shaftHz, declaredHz, samples };
}

/** Noise of r.m.s. 1, half of it through a broad resonance, with modulation by the shaft on every second machine. */
function noiseOf(random: SeededRandom, shaftHz: number): Float64Array {
  const depth = random.uniform() < 0.5 ? 0.3 * random.uniform() : 0;
  const omega = (2 * Math.PI * (1000 + 3000 * random.uniform())) / sampleRateHz;
  const decay = Math.exp(-0.2 * omega);
  const [a1, a2] = [2 * decay * Math.cos(omega), -decay * decay];
  const turn = (2 * Math.PI * shaftHz) / sampleRateHz;
  const shaped = new Float64Array(frames);
  let [y1, y2] = [0, 0];
  for (let n = 0; n < frames; n++) {
    const y = random.gaussian() + a1 * y1 + a2 * y2;
    [y2, y1] = [y1, y];
    shaped[n] = y;
  }
  const scale = Math.SQRT1_2 / rms(shaped);
  const out = new Float64Array(frames);
  for (let n = 0; n < frames; n++) {
    out[n] = (1 + depth * Math.cos(turn * n)) * (scale * shaped[n] + Math.SQRT1_2 * random.gaussian());
  }
  return scaled(out, 1 / rms(out));
}

/** Six harmonics of random size, 1x the largest as a rule; together about as strong as the noise. */
function addShaft(samples: Float64Array, random: SeededRandom, shaftHz: number): void {
  for (let harmonic = 1; harmonic <= 6; harmonic++) {
    addTone(samples, random, harmonic * shaftHz, (0.2 + 0.8 * random.uniform()) / harmonic);
  }
}

function addMesh(samples: Float64Array, random: SeededRandom, shaftHz: number): void {
  const teeth = 19 + Math.floor(60 * random.uniform());
  for (let harmonic = 1; harmonic <= 3; harmonic++) {
    const size = (0.3 * random.uniform()) / harmonic;
    addTone(samples, random, harmonic * teeth * shaftHz, size);
    for (const side of [-1, 1]) addTone(samples, random, (harmonic * teeth + side) * shaftHz, 0.2 * size);
  }
}

function addTone(samples: Float64Array, random: SeededRandom, hz: number, amplitude: number): void {
  if (hz >= sampleRateHz / 2) return;
  const step = (2 * Math.PI * hz) / sampleRateHz;
  const phase = 2 * Math.PI * random.uniform();
  for (let n = 0; n < samples.length; n++) samples[n] += amplitude * Math.cos(step * n + phase);
}

function addFault(
  samples: Float64Array,
  random: SeededRandom,
  bearing: RollingBearing,
  shaftHz: number,
  fault: SimulatedFault,
): void {
  const { ftf, bsf } = bearingMultiples(bearing);
  const n = bearing.geometry?.rollingElements ?? 0;
  // The cage falls behind; what rolls on the outer race comes later, on the inner race sooner.
  const cageHz = (ftf ?? 0) * shaftHz * (1 - 0.01 * random.uniform());
  const hz = {
    'outer race': n * cageHz,
    'inner race': n * (shaftHz - cageHz),
    'rolling element': 2 * (bsf ?? 0) * shaftHz * (1 + 0.01 * (2 * random.uniform() - 1)),
  }[fault];
  const modulationHz = { 'outer race': null, 'inner race': shaftHz, 'rolling element': cageHz }[fault];
  addImpacts(samples, random, { hz, jitter: 0.01, levelDb: -12 + 12 * random.uniform(), modulationHz });
}

interface Impacts {
  readonly hz: number;
  readonly jitter: number;
  /** r.m.s. against that of the noise. */
  readonly levelDb: number;
  /** What carries the defect through the load zone. */
  readonly modulationHz: number | null;
}

function addImpacts(samples: Float64Array, random: SeededRandom, impacts: Impacts): void {
  const { hz, jitter, levelDb, modulationHz } = impacts;
  const push = new Float64Array(samples.length);
  const spacing = sampleRateHz / hz;
  const phase = 2 * Math.PI * random.uniform();
  for (
    let at = spacing * random.uniform();
    at < samples.length;
    at += spacing * (1 + jitter * random.gaussian())
  ) {
    const turned = modulationHz === null ? 0 : (2 * Math.PI * modulationHz * at) / sampleRateHz + phase;
    const load = modulationHz === null ? 1 : 0.5 + 0.5 * Math.cos(turned);
    push[Math.floor(at)] += load * (0.8 + 0.4 * random.uniform());
  }
  const omega = (2 * Math.PI * (2700 + 4600 * random.uniform())) / sampleRateHz;
  const decay = Math.exp(-(0.01 + 0.03 * random.uniform()) * omega);
  const [a1, a2] = [2 * decay * Math.cos(omega), -decay * decay];
  let [y1, y2] = [0, 0];
  for (let n = 0; n < push.length; n++) {
    const y = push[n] + a1 * y1 + a2 * y2;
    [y2, y1] = [y1, y];
    push[n] = y;
  }
  const size = 10 ** (levelDb / 20) / rms(push);
  for (let n = 0; n < samples.length; n++) samples[n] += size * push[n];
}

function rms(samples: Float64Array): number {
  let sum = 0;
  for (const value of samples) sum += value * value;
  return Math.sqrt(sum / samples.length);
}

function scaled(samples: Float64Array, by: number): Float64Array {
  return samples.map((value) => by * value);
}
