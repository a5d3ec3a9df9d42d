import type { Belt, Coupling, VanesOrBlades } from '../config/parts.ts';
import { printFrequency } from '../config/print-value.ts';
import { partInSentence } from './evidence-words.ts';
import { characteristicFrequencies, shaftsOf, slipAllowance } from './fault-frequencies.ts';
import { harmonicName } from './line-names.ts';
import { ordinaryLines, supplies } from './ordinary-lines.ts';
import { halfOrderWords, multiplesWords, orderWords, sidebandWords, untoldWords } from './part-words.ts';
import type { PicturePlace } from './pictures.ts';
import { lineAt, mainLobesApartLines, sidebandPicture } from './sidebands.ts';
import { type Looked, nothingSought, type PartSearch, type Sought } from './sought.ts';
import { isSeparable, nearestHarmonic, type SeenShaft, separationLines } from './standing-lines.ts';

const harmonicsOfOtherShafts = 10;

/** Vane or blade pass with sidebands at the wheel's shaft: told, and no fault (common practice). */
export function wheelSought(looked: Looked, part: VanesOrBlades): Sought[] {
  const { spectrum, speed, partsOfMachine } = looked;
  const shaftHz = part.shaft * speed.hz;
  const passHz = part.count * shaftHz;
  const frequency = part.kind === 'vanes' ? 'vane pass' : 'blade pass';
  const carriers = [1, 2, 3].flatMap((harmonic) => {
    const uncertaintyHz = harmonic * part.count * part.shaft * speed.uncertaintyHz;
    const line = lineAt(spectrum, harmonic * passHz, Math.min(uncertaintyHz, shaftHz / 4));
    if (line === null) return [];
    // Where the pass is no stronger than what stands beside it, it is a harmonic of 1x like any other.
    const beside = [-2, -1, 1, 2].map((turns) => lineAt(spectrum, line.frequencyHz + turns * shaftHz, 0));
    if (beside.some((one) => one !== null && one.level > line.level)) return [];
    return [{ hz: line.frequencyHz, level: line.level, harmonic }];
  });
  const ordinary = ordinaryLines(partsOfMachine, part, speed);
  const near = separationLines * spectrum.lineSpacingHz;
  const picture = sidebandPicture({
    ...{ carriers, betweenHz: passHz, stepHz: shaftHz, windowHz: part.shaft * speed.uncertaintyHz },
    ...{ mostOrders: 2, firstPart: 0.03, leastPart: 0.03 },
    counts: (hz) => ordinary.every((one) => Math.abs(one - hz) >= near),
  });
  if (picture === null || shaftHz < mainLobesApartLines * spectrum.lineSpacingHz) return [];
  const turns = (times: number) => `${Number((times * part.shaft).toPrecision(4))}x`;
  return [
    {
      ...{ part, fault: frequency, frequency, isObservation: true, picture, expectedHz: passHz },
      observedHz: () => carriers[0].hz / carriers[0].harmonic,
      words: (shown) =>
        sidebandWords(shown, carriers, {
          ...{ at: turns(1), around: `the ${frequency}`, part: part.name },
          suggests: ['the flow, or the clearance, changes within a turn'],
        }),
      nameOf: ({ besideHz, times }) => {
        const harmonic = carriers.find(({ hz }) => hz === besideHz)?.harmonic ?? 1;
        return `${harmonicName(frequency, harmonic)} ${times < 0 ? '-' : '+'} ${turns(Math.abs(times))}`;
      },
    },
  ];
}

const multiplesOfBelt = 4;

/** The belt's own frequency and its first multiples, two of them below 1x of its pulley (common practice); belts creep. */
export function beltSought(looked: Looked, part: Belt): PartSearch {
  const { spectrum, speed, partsOfMachine } = looked;
  const own = characteristicFrequencies(part).find(({ kind }) => kind === 'belt');
  if (own === undefined) return nothingSought;
  const stepHz = own.perTurn * speed.hz;
  const windowHz = (slipAllowance + speed.uncertaintyHz / speed.hz) * stepHz;
  const shaftHz = part.shaft * speed.hz;
  const below = Math.floor((shaftHz - separationLines * spectrum.lineSpacingHz) / (stepHz + windowHz));
  const about = { part, fault: 'belt', frequency: 'belt', expectedHz: stepHz };
  if (stepHz < mainLobesApartLines * spectrum.lineSpacingHz) {
    if (lineAt(spectrum, stepHz, windowHz) === null) return nothingSought;
    const neededHz = stepHz / mainLobesApartLines;
    const what = `the belt frequency of ${partInSentence(part.name)} (${printFrequency(stepHz)})`;
    return {
      sought: [],
      untold: [{ ...about, neededHz, words: untoldWords(what, 'its multiples', neededHz) }],
    };
  }
  if (below < 2) return nothingSought;
  const shafts = [...otherShafts(looked, part), ...supplies(partsOfMachine)];
  const counts = (hz: number) => shafts.every((shaft) => isSeparable(hz, shaft, spectrum.lineSpacingHz));
  const multiples = Array.from(
    { length: multiplesOfBelt },
    (_, n): PicturePlace => ({ besideHz: 0, times: n + 1, leastLevel: 0 }),
  );
  const free = multiples.filter(({ times }) => times <= below && counts(times * stepHz)).length;
  if (!counts(stepHz)) {
    if (lineAt(spectrum, stepHz, windowHz) === null) return nothingSought;
    const what = `the belt frequency of ${partInSentence(part.name)} (${printFrequency(stepHz)})`;
    const beside = shafts.reduce((a, b) => (roomBeside(stepHz, a) < roomBeside(stepHz, b) ? a : b));
    const neededHz = Math.max(0, roomBeside(stepHz, beside)) / separationLines;
    const told = `a shaft or the supply (${printFrequency(nearestHarmonic(stepHz, beside) * beside.hz)})`;
    return { sought: [], untold: [{ ...about, neededHz, words: untoldWords(what, told, neededHz) }] };
  }
  const between = multiples.map(({ besideHz, times }) => ({ besideHz, times: times - 0.5 }));
  return {
    untold: [],
    sought: [
      {
        ...about,
        isObservation: false,
        picture: {
          ...{ stepHz, windowHz, places: multiples, compare: between, compareFrom: 0, counts },
          ...{ regions: [{ fromHz: spectrum.fromHz, toHz: 4 * shaftHz }], spans: [multiplesOfBelt] },
          ...{ least: 3, inPairs: false, leastWithin: { steps: below, lines: Math.min(2, free) } },
        },
        observedHz: (shown) => shown.stepHz,
        words: (shown) => multiplesWords(shown, part.name, below),
        nameOf: ({ times }) => harmonicName('belt', times),
      },
    ],
  };
}

/** How far a frequency lies off the harmonics of a shaft for certain, Hz. */
function roomBeside(hz: number, shaft: SeenShaft): number {
  const harmonic = nearestHarmonic(hz, shaft);
  return Math.abs(hz - harmonic * shaft.hz) - harmonic * shaft.uncertaintyHz;
}

/** The shafts whose lines are no belt's, the one that the belt drives as far as its creep leaves it known. */
function otherShafts({ speed, partsOfMachine }: Looked, part: Belt): SeenShaft[] {
  const driven =
    part.otherPulleyDiameter === null ? null : (part.shaft * part.pulleyDiameter) / part.otherPulleyDiameter;
  return shaftsOf(partsOfMachine).map((turns) => {
    const isDriven = driven !== null && Math.abs(turns - driven) < 1e-9;
    const creepHz = isDriven ? slipAllowance * turns * speed.hz : 0;
    const uncertaintyHz = turns * speed.uncertaintyHz + creepHz;
    return { hz: turns * speed.hz, uncertaintyHz, harmonics: isDriven ? 3 : harmonicsOfOtherShafts };
  });
}

/** Multiples of 1x that are counted, and how many are more than sound machines show as a rule (ours; no standard says). */
const firstCounted = 4;
const lastCounted = 20;
const manyHarmonics = 8;
const halfOrders = 10;

/**
 * Many harmonics of 1x, and half orders: what looseness, a rub or a worn coupling may make, and other things as well, so
 * that it is told as what stands there and no more (common practice).
 */
export function couplingSought(looked: Looked, part: Coupling): Sought[] {
  const { spectrum, speed, partsOfMachine } = looked;
  const { lineSpacingHz } = spectrum;
  const hz = part.shaft * speed.hz;
  if (hz / 2 < mainLobesApartLines * lineSpacingHz) return [];
  const near = separationLines * lineSpacingHz;
  const ordinary = ordinaryLines(partsOfMachine, part, speed);
  const shafts: SeenShaft[] = [
    ...shaftsOf(partsOfMachine)
      .filter((turns) => turns !== part.shaft)
      .map((turns) => ({ hz: turns * speed.hz, uncertaintyHz: 0, harmonics: harmonicsOfOtherShafts })),
    ...supplies(partsOfMachine),
  ];
  const isOpen = (at: number) =>
    ordinary.every((one) => Math.abs(one - at) >= near) &&
    shafts.every((shaft) => isSeparable(at, shaft, lineSpacingHz));
  const own = { hz, uncertaintyHz: part.shaft * speed.uncertaintyHz, harmonics: Number.POSITIVE_INFINITY };
  const regions = [{ fromHz: Math.max(spectrum.fromHz, 0.3 * hz), toHz: (lastCounted + 0.5) * hz }];
  const at = (times: number): PicturePlace => ({ besideHz: 0, times, leastLevel: 0 });
  const quarters = Array.from({ length: 2 * halfOrders }, (_, n) => at(n / 2 + 0.25));
  const common = { part, isObservation: true, expectedHz: hz, observedHz: () => hz };
  const windowHz = own.uncertaintyHz;
  return [
    {
      ...common,
      ...{ fault: 'harmonics of 1x', frequency: 'harmonics of 1x' },
      picture: {
        ...{
          stepHz: hz,
          windowHz,
          compare: quarters,
          compareFrom: 0.5,
          spans: [12, lastCounted],
          regions,
          counts: isOpen,
        },
        ...{ least: manyHarmonics, inPairs: false },
        places: Array.from({ length: lastCounted - firstCounted + 1 }, (_, n) => at(n + firstCounted)),
      },
      words: (shown) => orderWords(shown, part.shaft),
      nameOf: ({ times }) => `${Number((times * part.shaft).toPrecision(4))}x`,
    },
    {
      ...common,
      ...{ fault: 'half orders', frequency: 'half orders', expectedHz: hz / 2, observedHz: () => hz / 2 },
      picture: {
        ...{
          stepHz: hz,
          windowHz,
          compare: quarters,
          compareFrom: 0.5,
          spans: [3, 5, halfOrders],
          regions,
          least: 3,
          inPairs: false,
        },
        places: Array.from({ length: halfOrders }, (_, n) => at(n + 0.5)),
        counts: (one) => isOpen(one) && isSeparable(one, own, lineSpacingHz),
      },
      words: (shown) => halfOrderWords(shown, part.shaft),
      nameOf: ({ times }) => `${Number((times * part.shaft).toPrecision(4))}x`,
    },
  ];
}
