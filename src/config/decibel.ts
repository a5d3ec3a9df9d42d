import { type Parsed, refused, shorten, splitNumber, understood } from './quantity.ts';
import type { DisplayUnit, Quantity } from './site.ts';

/**
 * Levels in decibels, 20 lg(r.m.s. / reference), with the reference values of ISO 1683:2015 for vibration and for sound
 * in gases. Others are met (10 µm/s², 50 nm/s), and a level without its reference says nothing: it is always printed.
 * Checked: 1 m/s² is 120 dB, 9.80665 m/s² 139.83 dB, 4.5 mm/s 133.06 dB, 1 µm 120 dB.
 */
interface Reference {
  readonly inSi: number;
  readonly text: string;
  /** Further spellings, without spaces. */
  readonly also: readonly string[];
}

const references: Partial<Record<Quantity, Reference>> = {
  acceleration: {
    inSi: 1e-6,
    text: '1 µm/s²',
    also: ['1um/s2', '1um/s^2', '1e-6m/s2', '1e-6m/s^2', '1e-6m/s²'],
  },
  velocity: { inSi: 1e-9, text: '1 nm/s', also: ['1e-9m/s'] },
  displacement: { inSi: 1e-12, text: '1 pm', also: ['1e-12m'] },
  'sound-pressure': { inSi: 2e-5, text: '20 µPa', also: ['20upa', '2e-5pa'] },
};

/** How a band is shown in decibels; null where the standard has no reference for its quantity. */
export function decibelUnit(quantity: Quantity): DisplayUnit | null {
  const reference = references[quantity];
  if (reference === undefined) return null;
  const text = `dB re ${reference.text}`;
  return { text, quantity, inSi: 1, detector: 'rms', decibelReference: reference.inSi };
}

/** Quantities of which levels in decibels are understood, with their references, for messages. */
export function decibelsKnown(): string {
  return Object.entries(references)
    .map(([quantity, { text }]) => `${quantity} re ${text}`)
    .join(', ');
}

/** Whether a text behind a number, or by itself as a unit, speaks of decibels. */
export function isDecibel(rest: string): boolean {
  return /^dB(?![A-Za-z])/i.test(rest.trim());
}

/** SI r.m.s. of '133 dB' or '133 dB re 1 nm/s' for a band of that quantity. */
export function parseDecibels(text: string, quantity: Quantity): Parsed<number> {
  const split = splitNumber(text);
  if (!split.ok) return split;
  const { number, digits, rest } = split.value;
  const reference = references[quantity];
  if (reference === undefined)
    return refused(`'${shorten(text)}': no level in decibels of ${quantity} (${decibelsKnown()})`);
  if (!refersTo(rest, reference)) {
    const what = `'${shorten(text)}' is not re ${reference.text}, the reference of ISO 1683 for ${quantity}`;
    return refused(what, `${digits} dB`);
  }
  return understood(reference.inSi * 10 ** (number / 20));
}

/** A band's `unit: dB`, also with the reference behind it: the quantity that the reference is of; null: any. */
export function parseDecibelUnit(text: string): Parsed<Quantity | null> {
  if (/^dB$/i.test(text.trim())) return understood(null);
  const found = Object.entries(references).find(([, reference]) => refersTo(text, reference));
  return found === undefined
    ? refused(`'${shorten(text)}' has none of the references of ISO 1683 (${decibelsKnown()})`, 'dB')
    : understood(found[0] as Quantity);
}

function refersTo(text: string, { text: usual, also }: Reference): boolean {
  const plain = (one: string) =>
    one.replace(/[µμ]/g, 'u').replace(/²/g, '2').replace(/\s/g, '').toLowerCase();
  const said = plain(text).replace(/^db(re:?)?/, '');
  return said === '' || said === plain(usual) || also.includes(said);
}
