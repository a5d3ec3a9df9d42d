import type { ElectricMotor } from '../config/parts.ts';
import { printFrequency } from '../config/print-value.ts';
import { partInSentence } from './evidence-words.ts';
import { shaftsOf } from './fault-frequencies.ts';
import { harmonicName } from './line-names.ts';
import { gridUncertainty, ordinaryLines } from './ordinary-lines.ts';
import { sidebandWords, supplyWords, untoldWords } from './part-words.ts';
import type { Picture } from './pictures.ts';
import { type Carrier, lineAt, mainLobesApartLines, sidebandPicture } from './sidebands.ts';
import type { Looked, PartSearch, Sought, Untold } from './sought.ts';
import { isSeparable, nearestHarmonic, type SeenShaft, separationLines } from './standing-lines.ts';

/** Every rotor is a little uneven: sidebands below 1 % of their line count for nothing (ours; no standard says). */
const leastRotorPart = 0.01;
const leastBarPart = 0.03;
const shaftHarmonics = 3;
const supplyHarmonics = 3;
const harmonicsOfOtherShafts = 10;

/**
 * What the supply makes of a motor's vibration (common practice; chapter of frequencies in ISO 13373-9 on electric
 * motors): lines at twice the line frequency; broken or loose rotor bars beside 1x at the pole-pass frequency, poles x
 * slip; the passing of the rotor bars, with sidebands at twice line.
 */
export function motorSought(looked: Looked, part: ElectricMotor): PartSearch {
  const found = [supplyLine(looked, part), polePass(looked, part), barPass(looked, part)];
  return {
    sought: found.flatMap((one) => (one !== null && 'picture' in one ? [one] : [])),
    untold: found.flatMap((one) => (one !== null && 'neededHz' in one ? [one] : [])),
  };
}

/** The running speed in the motor's shaft. */
function shaftOf({ speed }: Looked, { shaft }: ElectricMotor): SeenShaft {
  const harmonics = Number.POSITIVE_INFINITY;
  return { hz: shaft * speed.hz, uncertaintyHz: shaft * speed.uncertaintyHz, harmonics };
}

/** Twice the line frequency and its multiples, where they are no harmonic of the shaft. */
function supplyLine(looked: Looked, part: ElectricMotor): Sought | Untold | null {
  const { spectrum } = looked;
  const twiceHz = 2 * part.lineHz;
  const windowHz = gridUncertainty * twiceHz;
  const shaft = shaftOf(looked, part);
  const line = lineAt(spectrum, twiceHz, windowHz);
  if (line === null) return null;
  const harmonic = nearestHarmonic(twiceHz, shaft);
  const apartHz = Math.abs(twiceHz - harmonic * shaft.hz) - harmonic * shaft.uncertaintyHz;
  const about = { part, fault: 'magnetic field', frequency: 'twice line', expectedHz: twiceHz };
  const counts = (hz: number) => isSeparable(hz, shaft, spectrum.lineSpacingHz);
  if (!counts(twiceHz) || !counts(line.frequencyHz)) {
    const neededHz = apartHz > windowHz ? apartHz / mainLobesApartLines : 0;
    const what = `twice line of ${partInSentence(part.name)} (${printFrequency(twiceHz)})`;
    const beside = `${harmonic}x (${printFrequency(harmonic * shaft.hz)})`;
    return { ...about, neededHz, words: untoldWords(what, beside, neededHz) };
  }
  const harmonics = Array.from({ length: supplyHarmonics }, (_, n) => n + 1);
  const picture: Picture = {
    ...{
      stepHz: twiceHz,
      windowHz,
      counts,
      compare: [],
      compareFrom: 0,
      spans: [1, 2, 3],
      least: 1,
      inPairs: false,
    },
    places: harmonics.map((times) => ({ besideHz: 0, times, leastLevel: 0 })),
    regions: [{ fromHz: twiceHz / 2, toHz: (supplyHarmonics + 0.5) * twiceHz }],
  };
  return {
    ...about,
    isObservation: true,
    picture,
    observedHz: ({ stepHz }) => stepHz,
    words: (shown) => supplyWords(shown, { part: part.name, harmonic, shaftHz: shaft.hz }),
    nameOf: ({ times }) => harmonicName('twice line', times),
  };
}

/** Sidebands of the shaft's harmonics at the poles' passing. */
function polePass(looked: Looked, part: ElectricMotor): Sought | Untold | null {
  const { spectrum, speed, partsOfMachine } = looked;
  const { lineSpacingHz } = spectrum;
  const shaft = shaftOf(looked, part);
  const stepHz = Math.abs(2 * part.lineHz - part.poles * shaft.hz);
  const windowHz = gridUncertainty * 2 * part.lineHz + part.poles * shaft.uncertaintyHz;
  // So much slip no motor on its line has: it is fed by something else, or runs as another machine than was said.
  if (stepHz > shaft.hz / 4) return null;
  const carriers = carriersOf(looked, shaft, shaftHarmonics);
  if (carriers.length === 0) return null;
  const about = { part, fault: 'rotor bars', frequency: 'pole pass', expectedHz: stepHz };
  if (stepHz - windowHz < mainLobesApartLines * lineSpacingHz || stepHz < 2 * windowHz) {
    const neededHz = stepHz > 2 * windowHz ? (stepHz - windowHz) / mainLobesApartLines : 0;
    const what = `pole-pass sidebands of ${partInSentence(part.name)} (${printFrequency(stepHz)} beside it)`;
    return { ...about, neededHz, words: untoldWords(what, '1x', neededHz) };
  }
  const near = separationLines * lineSpacingHz;
  const ordinary = ordinaryLines(partsOfMachine, part, speed);
  const others = shaftsOf(partsOfMachine).filter((turns) => turns !== part.shaft);
  const counts = (hz: number) =>
    ordinary.every((one) => Math.abs(one - hz) >= near) &&
    Math.abs(hz - 2 * part.lineHz) >= near + gridUncertainty * 2 * part.lineHz &&
    Math.abs(hz - part.lineHz) >= near &&
    others.every((turns) =>
      isSeparable(
        hz,
        { hz: turns * speed.hz, uncertaintyHz: 0, harmonics: harmonicsOfOtherShafts },
        lineSpacingHz,
      ),
    );
  const picture = sidebandPicture({
    ...{ carriers, betweenHz: shaft.hz, stepHz, windowHz, counts },
    ...{ mostOrders: 3, firstPart: leastRotorPart, leastPart: leastRotorPart },
  });
  if (picture === null) return null;
  return {
    ...about,
    isObservation: false,
    picture,
    observedHz: (shown) => shown.stepHz,
    words: (shown) =>
      sidebandWords(shown, carriers, {
        at: `the pole pass (${printFrequency(shown.stepHz)})`,
        around: '1x',
        part: part.name,
        suggests: ['rotor bars, or a load that swings'],
      }),
    nameOf: ({ besideHz, times }) =>
      sideName(`${carriers.find(({ hz }) => hz === besideHz)?.harmonic ?? 1}x`, 'pole pass', times),
  };
}

/** The passing of the rotor bars with sidebands at twice line. */
function barPass(looked: Looked, part: ElectricMotor): Sought | Untold | null {
  if (part.rotorBars === null) return null;
  const { spectrum, partsOfMachine, speed } = looked;
  const { lineSpacingHz } = spectrum;
  const shaft = shaftOf(looked, part);
  const bars = {
    ...shaft,
    hz: part.rotorBars * shaft.hz,
    uncertaintyHz: part.rotorBars * shaft.uncertaintyHz,
  };
  const carriers = carriersOf(looked, bars, 2);
  if (carriers.length === 0 || bars.uncertaintyHz > shaft.hz / 2 - lineSpacingHz) return null;
  const twiceHz = 2 * part.lineHz;
  const about = { part, fault: 'rotor bar pass', frequency: 'rotor bar pass', expectedHz: bars.hz };
  const ordinary = ordinaryLines(partsOfMachine, part, speed);
  const near = separationLines * lineSpacingHz;
  // A sideband lies the pole pass off a harmonic of the shaft; by the observed bar pass the two lie sure to each other.
  const offHz = Math.abs(twiceHz - Math.round(twiceHz / shaft.hz) * shaft.hz);
  if (offHz < near + gridUncertainty * twiceHz) {
    const beside = carriers.some(({ hz }) =>
      [-1, 1].some((side) => lineAt(spectrum, hz + side * twiceHz, 0) !== null),
    );
    if (!beside) return null;
    const neededHz = offHz > 0.002 * shaft.hz ? offHz / mainLobesApartLines : 0;
    const what = `sidebands at twice line of the bar pass of ${partInSentence(part.name)} (${printFrequency(bars.hz)})`;
    return { ...about, neededHz, words: untoldWords(what, 'harmonics of the shaft', neededHz) };
  }
  const isShafts = (hz: number, carrier: Carrier) => {
    const beside = Math.abs(hz - carrier.hz);
    return Math.abs(beside - Math.round(beside / shaft.hz) * shaft.hz) < near;
  };
  const picture = sidebandPicture({
    ...{ carriers, betweenHz: bars.hz, stepHz: twiceHz, windowHz: gridUncertainty * twiceHz },
    ...{ mostOrders: 2, firstPart: leastBarPart, leastPart: leastBarPart },
    counts: (hz) =>
      ordinary.every((one) => Math.abs(one - hz) >= near) &&
      carriers.every((carrier) => !isShafts(hz, carrier)),
  });
  if (picture === null) return null;
  return {
    ...about,
    isObservation: true,
    picture,
    observedHz: () => carriers[0].hz / carriers[0].harmonic,
    words: (shown) =>
      sidebandWords(shown, carriers, {
        at: 'twice line',
        around: 'the bar pass',
        part: part.name,
        suggests: ['sound motors may show them; loose or uneven bars make them grow'],
      }),
    nameOf: ({ besideHz, times }) =>
      sideName(
        harmonicName('rotor bar pass', carriers.find(({ hz }) => hz === besideHz)?.harmonic ?? 1),
        'twice line',
        times,
      ),
  };
}

function sideName(carrier: string, beside: string, times: number): string {
  return `${carrier} ${times < 0 ? '-' : '+'} ${harmonicName(beside, Math.abs(times))}`;
}

/** The harmonics of a frequency that stand out. */
function carriersOf(
  { spectrum }: Looked,
  of: { readonly hz: number; readonly uncertaintyHz: number },
  most: number,
): Carrier[] {
  const carriers: Carrier[] = [];
  for (let harmonic = 1; harmonic <= most; harmonic++) {
    const line = lineAt(spectrum, harmonic * of.hz, harmonic * of.uncertaintyHz);
    if (line !== null) carriers.push({ hz: line.frequencyHz, level: line.level, harmonic });
  }
  return carriers;
}
