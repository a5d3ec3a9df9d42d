import { printFrequency, printNumber } from '../config/print-value.ts';
import { partInSentence } from './evidence-words.ts';
import type { Shown } from './pictures.ts';
import type { Carrier } from './sidebands.ts';

/** Behind what the trade holds without a standard or a paper that says it first. */
const practice = 'common practice';

const counts = [
  'no',
  'one',
  'two',
  'three',
  'four',
  'five',
  'six',
  'seven',
  'eight',
  'nine',
  'ten',
  'eleven',
  'twelve',
];

export function countWord(count: number): string {
  return counts[count] ?? String(count);
}

export function highestDb({ lines }: Shown): number {
  return Math.max(...lines.map(({ line }) => line.aboveFloorDb));
}

/** Carriers of the picture that sidebands stand beside. */
export function carriersWith({ lines }: Shown, carriers: readonly Carrier[]): readonly Carrier[] {
  return carriers.filter(({ hz }) => lines.some(({ place }) => place.besideHz === hz));
}

/**
 * 'eight sidebands at 1x around two harmonics of the mesh of the gearbox (678.5 Hz), the strongest 6 dB under its line and
 * 21 dB over the floor; common practice: the gear at 1x: wear, run-out or a tooth'.
 */
export function sidebandWords(
  shown: Shown,
  carriers: readonly Carrier[],
  about: {
    readonly at: string;
    readonly around: string;
    readonly part: string;
    readonly suggests: readonly string[];
  },
): string {
  const with_ = carriersWith(shown, carriers);
  const [first] = with_;
  const around =
    with_.length === 1 ? about.around : `${countWord(with_.length)} harmonics of ${about.around}`;
  const hz = first === undefined ? '' : ` (${printFrequency(first.hz / first.harmonic)})`;
  const levelOf = (besideHz: number) => carriers.find((one) => one.hz === besideHz)?.level ?? 0;
  const ratioDb = Math.max(
    ...shown.lines.map(({ line, place }) => 20 * Math.log10(line.level / levelOf(place.besideHz))),
  );
  const beside =
    ratioDb < 0
      ? `${printNumber(-ratioDb, 2)} dB under its line`
      : `${printNumber(ratioDb, 2)} dB over its line`;
  return (
    `${countWord(shown.lines.length)} sidebands at ${about.at} around ${around} of ${partInSentence(about.part)}${hz}, ` +
    `the strongest ${beside}, ${printNumber(highestDb(shown), 2)} dB over the floor; ${practice}: ${about.suggests.join(', ')}`
  );
}

/** 'a line at twice line of the motor (100 Hz), 1.33 Hz from 2x, 22 dB over the floor; common practice: electrical'. */
export function supplyWords(
  shown: Shown,
  { part, harmonic, shaftHz }: { readonly part: string; readonly harmonic: number; readonly shaftHz: number },
): string {
  const lines = shown.lines.length === 1 ? 'a line' : `${countWord(shown.lines.length)} harmonics`;
  const of = shown.lines.length === 1 ? 'at twice line' : 'of twice line';
  const apart = printFrequency(Math.abs(shown.stepHz - harmonic * shaftHz), 3);
  return (
    `${lines} ${of} of ${partInSentence(part)} (${printFrequency(shown.stepHz)}), ${apart} from ${harmonic}x, ` +
    `${printNumber(highestDb(shown), 2)} dB over the floor; ${practice}: electrical, of no fault while it stays as it is`
  );
}

/** 'three multiples of the belt frequency of the drive belt (7.54 Hz), two of them below 1x, 12 dB over the floor; ...'. */
export function multiplesWords(shown: Shown, part: string, below: number): string {
  const under = shown.lines.filter(({ place }) => place.times <= below).length;
  return (
    `${countWord(shown.lines.length)} multiples of the belt frequency of ${partInSentence(part)} ` +
    `(${printFrequency(shown.stepHz)}), ${countWord(under)} of them below 1x, ` +
    `${printNumber(highestDb(shown), 2)} dB over the floor; ${practice}: the belt, worn, uneven or loose`
  );
}

export function orderWords(shown: Shown, shaft: number): string {
  const last = Math.max(...shown.lines.map(({ place }) => place.times));
  return `${countWord(shown.lines.length)} harmonics from 4x on, up to ${turns(last * shaft)}, ${printNumber(highestDb(shown), 2)} dB over the floor; ${practice}: looseness, a rub, a worn coupling, or a shape that is no sine`;
}

export function halfOrderWords(shown: Shown, shaft: number): string {
  const orders = shown.lines.map(({ place }) => turns(place.times * shaft)).slice(0, 4);
  const more = shown.lines.length > orders.length ? ' and more' : '';
  return `half orders (${orders.join(', ')}${more}), ${printNumber(highestDb(shown), 2)} dB over the floor; ${practice}: looseness or a rub`;
}

function turns(times: number): string {
  return `${Number(times.toPrecision(4))}x`;
}

export function untoldWords(what: string, beside: string, neededHz: number): string {
  const remedy =
    neededHz === 0 ? 'no line spacing would' : `lines ${printFrequency(neededHz, 2)} apart or closer would`;
  return `${what} cannot be told from ${beside} in the spectrum; ${remedy}`;
}
