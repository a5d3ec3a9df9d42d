import { planetaryFrequencies, planetarySpeeds } from '../../src/assessment/planetary-frequencies.ts';
import type { ElectricMotor, Part, PlanetaryGear } from '../../src/config/parts.ts';
import type { SeededRandom } from '../signal/random.ts';
import { belt, gearPair, motor, planetary, wheel } from './parts.ts';
import { SampledMachine } from './sampled-machine.ts';

/**
 * Machines with gears, motors, belts, wheels and couplings, sound or with one fault, as a plain spectrum hears them:
 * harmonics of the shaft (6 at least), half white and half low noise, what the sound part makes (a mesh with a weak first
 * pair of sidebands of both gears, twice line, vane pass, the shaft that a belt drives), and the lines of the fault. The
 * declared speed is wrong by 0.5 %, that of a planetary set is of pulses, the line frequency by up to 0.1 %, belts creep by up to 1 %.
 */
export interface PartsMachine {
  readonly parts: readonly Part[];
  readonly shaftHz: number;
  readonly declaredHz: number;
  /** True where the speed was measured from pulses, to 0.02 %: the spectrum is not asked. */
  readonly pulses?: true;
  readonly rateHz: number;
  readonly segmentSamples: number;
  readonly samples: Float64Array;
}

export const machineKinds = ['gear pair', 'planetary set', 'motor', 'belt', 'wheel', 'coupling'] as const;
export type MachineOf = (typeof machineKinds)[number];

/** A fault each kind may have, by the name of its evidence; of wheels and couplings what is observed. */
export const faultsOf = {
  'gear pair': ['gear on the shaft', 'mating gear'],
  'planetary set': ['sun', 'carrier', 'tooth of a planet'],
  motor: ['rotor bars'],
  belt: ['belt'],
  wheel: ['vane pass'],
  coupling: ['harmonics of 1x', 'half orders'],
} as const satisfies Readonly<Record<MachineOf, readonly string[]>>;

/** What else a sound machine may show: harmonics of 1x throughout, as of a rub or a loose foot, or lines of strangers. */
export type Beside = 'nothing' | 'harmonics' | 'strangers';

export function partsMachine(
  random: SeededRandom,
  kind: MachineOf,
  fault: string | null,
  beside: Beside = 'nothing',
): PartsMachine {
  const machine = soundOrNot(random, kind, fault);
  const { rateHz, samples, shaftHz } = machine;
  if (beside === 'nothing') return machine;
  const recording = new SampledMachine(random, rateHz, samples.length, 0);
  const size = between(random, 0.05, 0.3);
  for (let n = 1; n <= (beside === 'harmonics' ? 60 : 40); n++) {
    const hz = beside === 'harmonics' ? n * shaftHz : 4 * (rateHz / 10) ** random.uniform();
    recording.tone(hz, size * (0.3 + 0.7 * random.uniform()));
  }
  return { ...machine, samples: samples.map((value, n) => value + recording.samples[n]) };
}

function soundOrNot(random: SeededRandom, kind: MachineOf, fault: string | null): PartsMachine {
  switch (kind) {
    case 'gear pair':
      return gearMachine(random, fault);
    case 'planetary set':
      return planetaryMachine(random, fault);
    case 'motor':
      return motorMachine(random, fault);
    case 'belt':
      return beltMachine(random, fault);
    case 'wheel':
      return wheelMachine(random, fault);
    case 'coupling':
      return couplingMachine(random, fault);
  }
}

function recorded(
  random: SeededRandom,
  recording: SampledMachine,
  {
    shaftHz,
    parts,
    spacingHz,
  }: { readonly shaftHz: number; readonly parts: readonly Part[]; readonly spacingHz: number },
): PartsMachine {
  const { rateHz, samples } = recording;
  const declaredHz = shaftHz * (random.uniform() < 0.5 ? 1.005 : 0.995);
  return {
    parts,
    shaftHz,
    declaredHz,
    rateHz,
    segmentSamples: 2 ** Math.ceil(Math.log2(rateHz / spacingHz)),
    samples,
  };
}

const between = (random: SeededRandom, from: number, to: number) => from + (to - from) * random.uniform();
const whole = (random: SeededRandom, from: number, to: number) => Math.floor(between(random, from, to + 1));

/** Sidebands of one gear by order, in parts of the mesh line. */
function damage(random: SeededRandom): number[] {
  if (random.uniform() < 0.5) {
    // Run-out: the first pair from -9 to -3 dB, and little else.
    const first = between(random, 0.35, 0.7);
    return [first, first * between(random, 0.1, 0.4)];
  }
  // A tooth: many orders, from -14 to -6 dB on, falling by 1 to 3 dB each.
  const first = between(random, 0.2, 0.5);
  const falls = between(random, 0.7, 0.9);
  return Array.from({ length: 8 }, (_, n) => first * falls ** n);
}

/** A sound gear: the first pair up to -14 dB. */
const soundPair = (random: SeededRandom) => [between(random, 0.02, 0.2)];

function gearMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const shaftHz = between(random, 10, 50);
  const part = gearPair(whole(random, 17, 41), whole(random, 43, 101));
  const matingHz = (part.teeth * shaftHz) / part.matingTeeth;
  const recording = new SampledMachine(random, 12_800, 2 ** 17, 1);
  recording.shaft(shaftHz);
  for (let k = 1; k <= 3; k++) recording.tone(k * matingHz, between(random, 0.05, 0.4) / k);
  const ofShaft = fault === 'gear on the shaft' ? damage(random) : soundPair(random);
  const ofMating = fault === 'mating gear' ? damage(random) : soundPair(random);
  for (let m = 1; m <= 3; m++) {
    const mesh = between(random, 0.3, 1) / m;
    const hz = m * part.teeth * shaftHz;
    recording.tone(hz, mesh);
    for (const [stepHz, parts] of [[shaftHz, ofShaft] as const, [matingHz, ofMating] as const])
      recording.sidebands(
        hz,
        stepHz,
        parts.map((one) => one * mesh),
      );
  }
  // Lines that tell both gears: a quarter of the slower shaft.
  return recorded(random, recording, {
    shaftHz,
    parts: [part],
    spacingHz: Math.min(1.6, shaftHz / 25, matingHz / 4.5),
  });
}

/** A set whose shafts and defects have spacings of their own: first and second orders 12 % of a turn off each other. */
function separableSet(random: SeededRandom): PlanetaryGear {
  for (;;) {
    const sunTeeth = whole(random, 18, 30);
    const planetTeeth = whole(random, sunTeeth, 2 * sunTeeth);
    const ringTeeth = sunTeeth + 2 * planetTeeth;
    const part = planetary({ sunTeeth, planetTeeth, ringTeeth, planets: whole(random, 3, 4) });
    const turns = (kind: string) => planetaryFrequencies(part).find((one) => one.kind === kind)?.perTurn ?? 0;
    const steps = [1, turns('planet defect'), turns('planet pass'), turns('sun defect')];
    const apart = (a: number, b: number) =>
      [1, 2].every((i) => [1, 2].every((j) => Math.abs(i * a - j * b) > 0.12));
    if (steps.every((a, i) => steps.every((b, j) => i === j || apart(a, b)))) return part;
  }
}

function planetaryMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const shaftHz = between(random, 10, 50);
  const part = separableSet(random);
  const hzOf = (kind: string) =>
    (planetaryFrequencies(part).find((one) => one.kind === kind)?.perTurn ?? 0) * shaftHz;
  const carrierHz = planetarySpeeds(part).carrier * shaftHz;
  const recording = new SampledMachine(random, 12_800, 2 ** 17, 1);
  recording.shaft(shaftHz);
  for (let m = 1; m <= 3; m++) {
    const mesh = between(random, 0.3, 1) / m;
    const hz = m * hzOf('gear mesh');
    // Where the planets do not meet in phase the mesh line itself is weak.
    recording.tone(hz, mesh * (random.uniform() < 0.3 ? 0.05 : 1));
    recording.sidebands(hz, hzOf('planet pass'), [0.8 * mesh, 0.4 * mesh]);
    recording.sidebands(
      hz,
      carrierHz,
      soundPair(random).map((one) => one * mesh),
    );
    recording.sidebands(
      hz,
      shaftHz,
      soundPair(random).map((one) => one * mesh),
    );
  }
  if (fault !== null) {
    const stepHz = { sun: shaftHz, carrier: carrierHz }[fault] ?? hzOf('planet defect');
    const parts = damage(random);
    for (let m = 1; m <= 3; m++) {
      recording.sidebands(
        m * hzOf('gear mesh'),
        stepHz,
        parts.map((one) => (one * 0.7) / m),
      );
    }
  }
  const spacingHz = Math.min(1.6, shaftHz / 25, carrierHz / 4.5);
  const machine = recorded(random, recording, { shaftHz, parts: [part], spacingHz });
  return { ...machine, declaredHz: shaftHz * (1 + 0.0002 * between(random, -1, 1)), pulses: true };
}

function motorMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const ratedHz = random.uniform() < 0.5 ? 50 : 60;
  const lineHz = ratedHz * (1 + 0.001 * between(random, -1, 1));
  const poles = [2, 4, 6][whole(random, 0, 2)];
  const part: ElectricMotor = motor(ratedHz, poles, whole(random, 28, 52));
  const polePassHz = between(random, 1, 3);
  const shaftHz = (2 * lineHz - polePassHz) / poles;
  const recording = new SampledMachine(random, 5120, 2 ** 17, 0.2);
  // The load swings a little, slowly: skirts beside the harmonics.
  const swing = random.uniform() < 0.5 ? between(random, 0.005, 0.02) : 0;
  const harmonics = 6 + whole(random, 0, 4);
  const sound = [between(random, 0.0005, 0.004)];
  const bars = between(random, 0.05, 0.2);
  for (let k = 1; k <= harmonics; k++) {
    const amplitude = (0.4 + 0.8 * random.uniform()) / k;
    recording.tone(k * shaftHz, amplitude);
    for (let n = 0; n < 4; n++)
      recording.tone(k * shaftHz + between(random, -3, 3), swing * amplitude * random.uniform());
    const parts = fault === 'rotor bars' && k <= 3 ? [bars, bars * between(random, 0.3, 0.7)] : sound;
    recording.sidebands(
      k * shaftHz,
      polePassHz,
      parts.map((one) => one * amplitude),
    );
  }
  recording.tone(lineHz, between(random, 0, 0.1));
  for (let k = 1; k <= 3; k++) recording.tone(2 * k * lineHz, between(random, 0.05, 0.8) / k);
  const pass = between(random, 0.02, 0.2);
  const passHz = (part.rotorBars ?? 0) * shaftHz;
  recording.tone(passHz, pass);
  recording.sidebands(passHz, 2 * lineHz, random.uniform() < 0.5 ? [0.5 * pass, 0.2 * pass] : []);
  return recorded(random, recording, { shaftHz, parts: [part], spacingHz: 0.17 });
}

function beltMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const shaftHz = between(random, 15, 50);
  // Three or two multiples below 1x.
  const ratio = between(random, 0.26, 0.45);
  const part = belt({
    pulleyDiameter: 0.2,
    length: (Math.PI * 0.2) / ratio,
    otherPulleyDiameter: 0.2 / drivenBeside(random, ratio),
  });
  const creep = 1 - 0.01 * random.uniform();
  const recording = new SampledMachine(random, 2560, 2 ** 16, 0.5);
  recording.shaft(shaftHz);
  const drivenHz = (shaftHz * 0.2 * creep) / (part.otherPulleyDiameter ?? 1);
  for (let k = 1; k <= 3; k++) recording.tone(k * drivenHz, between(random, 0.1, 0.8) / k);
  if (fault !== null) {
    for (let k = 1; k <= 4; k++) recording.tone(k * ratio * shaftHz * creep, between(random, 0.15, 0.6));
  }
  return recorded(random, recording, { shaftHz, parts: [part], spacingHz: (ratio * shaftHz) / 40 });
}

/** Turns of the driven shaft for one of the pulley, 5 % clear of the belt frequency and of twice it. */
function drivenBeside(random: SeededRandom, ratio: number): number {
  for (;;) {
    const turns = 0.2 / between(random, 0.24, 0.5);
    if ([1, 2].every((times) => Math.abs(turns / (times * ratio) - 1) > 0.05)) return turns;
  }
}

function wheelMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const shaftHz = between(random, 10, 50);
  const count = whole(random, 7, 13);
  const part = wheel('vanes', count);
  const recording = new SampledMachine(random, 12_800, 2 ** 17, 1);
  recording.shaft(shaftHz);
  const sides = [between(random, 0.2, 0.6), between(random, 0.05, 0.3)];
  for (let m = 1; m <= 3; m++) {
    const pass = between(random, 0.3, 1) / m;
    recording.tone(m * count * shaftHz, pass);
    if (fault !== null)
      recording.sidebands(
        m * count * shaftHz,
        shaftHz,
        sides.map((one) => one * pass),
      );
  }
  return recorded(random, recording, { shaftHz, parts: [part], spacingHz: Math.min(1.6, shaftHz / 25) });
}

function couplingMachine(random: SeededRandom, fault: string | null): PartsMachine {
  const shaftHz = between(random, 10, 50);
  const part: Part = { kind: 'coupling', id: 'part', name: 'part', at: ['de-h'], shaft: 1, elements: null };
  const recording = new SampledMachine(random, 12_800, 2 ** 17, 1);
  recording.shaft(shaftHz);
  if (fault === 'harmonics of 1x')
    for (let k = 7; k <= whole(random, 15, 20); k++) recording.tone(k * shaftHz, between(random, 0.08, 0.4));
  if (fault === 'half orders')
    for (let k = 0; k <= whole(random, 3, 8); k++)
      recording.tone((k + 0.5) * shaftHz, between(random, 0.08, 0.4));
  return recorded(random, recording, { shaftHz, parts: [part], spacingHz: Math.min(1.6, shaftHz / 25) });
}
