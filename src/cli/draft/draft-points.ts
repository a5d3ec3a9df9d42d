import { parseSampleUnit } from '../../config/level.ts';
import type { Quantity } from '../../config/site.ts';
import type { SeriesLook } from './look.ts';
import { directionOf, isFiller, placeName } from './place-words.ts';
import { plainId } from './series-ids.ts';

/** A value of the site file with what stands behind it; `guess`: to be marked. */
export interface Written {
  readonly text: string;
  readonly guess: boolean;
  /** Short; null: nothing to say. */
  readonly note: string | null;
}

/** One channel of a series as a measuring point. */
export interface DraftChannel {
  readonly id: string;
  readonly name: string | null;
  readonly direction: string | null;
  /** A number from 1, or a column name. */
  readonly channel: string;
  readonly quantity: Quantity;
  readonly quantityWritten: Written;
  readonly sensitivity: Written | null;
  readonly samplesIn: Written;
  readonly fullScale: Written | null;
}

/** Channels of one file that are drafted; more are left to the site. */
export const mostChannels = 64;

/** The channels of a series as points. `placeId`: the point's id that the name holds; '' for none. */
export function draftChannels({ header }: SeriesLook, placeId: string): DraftChannel[] {
  const names = header.channelNames.slice(0, mostChannels);
  const taken = new Set<string>();
  return names.map((heading, index) => {
    const number = String(index + 1);
    const usable = isUsableHeading(heading, number);
    const own = usable ? plainId(heading) : '';
    const alone = names.length === 1;
    const channelId = own !== '' && !(alone && isFiller(own)) ? own : `ch${number}`;
    const wanted = placeId === '' ? channelId : alone ? placeId : `${placeId}-${channelId}`;
    const id = free(wanted.slice(0, 56), taken);
    const words = usable && placeId === '' ? heading : id;
    return {
      id,
      name: placeName(id) ?? (usable ? nameFrom(placeId, heading, id) : null),
      direction: directionOf(words),
      channel: usable ? heading : number,
      ...signalOf(header.channelUnits[index] ?? null, header.samples),
    };
  });
}

/** 'fan', 'DE H' -> 'fan, drive end, horizontal'; null where it says no more than the id. */
function nameFrom(placeId: string, heading: string, id: string): string | null {
  const place = placeId === '' ? [] : [placeName(placeId) ?? placeId];
  const name = [...place, placeName(heading) ?? heading].join(', ');
  return name === id ? null : name.slice(0, 80);
}

/** A heading that the site file takes for the same column again. */
function isUsableHeading(heading: string, number: string): boolean {
  if (heading === number || /^\d+$/.test(heading) || heading !== heading.trim()) return false;
  return heading.length <= 80 && /\p{L}/u.test(heading) && !/[\p{Cc}\p{Zl}\p{Zp}]/u.test(heading);
}

export function free(wanted: string, taken: Set<string>): string {
  let id = wanted;
  for (let count = 2; taken.has(id); count++) id = `${wanted}-${count}`;
  taken.add(id);
  return id;
}

const known = (text: string, note: string | null = null): Written => ({ text, guess: false, note });
const guessed = (text: string, note: string | null = null): Written => ({ text, guess: true, note });

/** Trended as it is, but no measure of vibration: a temperature, a speed. */
export function isOther({ quantity }: DraftChannel): boolean {
  return quantity === 'other';
}

function signalOf(
  unit: string | null,
  samples: 'integer' | 'number',
): Pick<DraftChannel, 'quantity' | 'quantityWritten' | 'sensitivity' | 'samplesIn' | 'fullScale'> {
  const fullScale = samples === 'integer' ? guessed('10 V', 'volts of the largest sample') : null;
  const fromVolts = {
    quantity: 'acceleration',
    quantityWritten: guessed('acceleration'),
    sensitivity: guessed('100 mV/g', 'see the sensor'),
    fullScale,
  } as const;
  if (unit === null && samples === 'integer') return { ...fromVolts, samplesIn: guessed('V') };
  if (unit === null) {
    return {
      quantity: 'acceleration',
      quantityWritten: guessed('acceleration'),
      sensitivity: null,
      samplesIn: guessed('m/s2', 'the files name no unit'),
      fullScale: null,
    };
  }
  const parsed = parseSampleUnit(spelled(unit));
  if (parsed.ok && parsed.value.quantity === 'voltage')
    return { ...fromVolts, fullScale: null, samplesIn: known(parsed.value.text, 'as the files say') };
  if (parsed.ok) {
    return {
      quantity: parsed.value.quantity,
      quantityWritten: known(parsed.value.quantity),
      sensitivity: null,
      samplesIn: known(parsed.value.text.replace('²', '2').replace('µ', 'u'), 'as the files say'),
      fullScale: null,
    };
  }
  const fits = unit.trim() !== '' && unit.trim().length <= 12 && !/[\p{Cc}\p{Zl}\p{Zp}]/u.test(unit);
  return {
    quantity: 'other',
    quantityWritten: guessed('other'),
    sensitivity: null,
    samplesIn: fits ? known(unit.trim(), 'as the files say') : guessed('units'),
    fullScale: null,
  };
}

/** Spellings of loggers that the site file does not know. */
function spelled(unit: string): string {
  const bare = unit.replace(/\s*(r\.?m\.?s\.?|rms|peak|pk-pk|pk|peak to peak)$/i, '').trim();
  const other: Readonly<Record<string, string>> = {
    gn: 'g',
    G: 'g',
    ips: 'in/s',
    mils: 'mil',
    'm/sec2': 'm/s2',
    'm/sec^2': 'm/s2',
    'm/s**2': 'm/s2',
    mv: 'mV',
    v: 'V',
  };
  return other[bare] ?? bare;
}
