import { secondsOfUnit } from './csv-time.ts';
import type { Refusal, StatedStart } from './recording.ts';
import type { SampleNumber } from './sample-numbers.ts';
import { realDateMs } from './start-in-name.ts';

/** How the values of a data set are written: in columns of text, or as bytes. */
export type UniversalStorage =
  | { readonly form: 'text'; readonly width: 13 | 20; readonly valuesALine: 6 | 4 }
  | { readonly form: 'binary'; readonly number: SampleNumber };

/** A time response of data set 58, as its eleven records describe it. */
export interface TimeResponse {
  readonly description: string;
  /** Response entity, node and direction, such as 'PUMP 3 +Z'; '' where none is given. */
  readonly response: string;
  readonly values: number;
  readonly intervalS: number;
  readonly unit: string | null;
  /** Null where the third line is no date; the text where it looks like one that cannot be taken. */
  readonly start: StatedStart | null;
  readonly startRefused: boolean;
  readonly storage: UniversalStorage;
}

/** What a data set 58 is instead of a time response. */
export interface OtherFunction {
  readonly functionType: number;
}

export const recordCount = 11;

/**
 * Records 1 to 11 of data set 58 (University of Cincinnati SDRL, universal file formats), by their columns. `byteOrder`
 * is of 58b, null for text. Complex or uneven time responses are refused rather than left out unnoticed.
 */
export function timeResponse(
  records: readonly string[],
  littleEndian: boolean | null,
): TimeResponse | OtherFunction | Refusal {
  const record = (number: number): string => records[number - 1] as string;
  const read = fields(record);
  const [functionType, node, direction] = [read.whole(6, 0, 5), read.whole(6, 41, 51), read.whole(6, 51, 55)];
  const [ordinate, values, spacing] = [read.whole(7, 0, 10), read.whole(7, 10, 20), read.whole(7, 20, 30)];
  const intervalS = read.real(7, 43, 56);
  const abscissa = read.whole(8, 0, 10);
  if (read.wrong !== null) return { refused: 'damaged', reason: read.wrong };
  // Some writers call a time response 'general' and say time with the abscissa only.
  if (functionType !== 1 && !(functionType === 0 && abscissa === 17)) return { functionType };
  const refuse = (refused: Refusal['refused'], reason: string): Refusal => ({ refused, reason });
  if (ordinate === 5 || ordinate === 6)
    return refuse('unsupported', 'complex values; export the time response as real values');
  if (ordinate !== 2 && ordinate !== 4)
    return refuse('damaged', `record 7: ordinate type ${ordinate}, where 2 or 4 is expected`);
  if (spacing !== 1)
    return refuse(
      spacing === 0 ? 'unsupported' : 'damaged',
      spacing === 0
        ? 'values at uneven times; export it with an even spacing'
        : `record 7: spacing ${spacing}, where 1 is expected`,
    );
  const unitOfTime = text(record(8), 47, 67);
  if (![undefined, 1].includes(secondsOfUnit(unitOfTime)))
    return refuse('unsupported', `its times are in ${unitOfTime}; export it in seconds`);
  if (values < 1) return refuse('damaged', `record 7: ${values} values`);
  const rateHz = 1 / intervalS;
  if (!(intervalS > 0 && rateHz > 0 && Number.isFinite(rateHz)))
    return refuse('damaged', `record 7: an interval of ${intervalS} s between values`);
  const unit = text(record(9), 47, 67);
  return {
    description: text(record(1), 0, 80),
    response: responseName(text(record(6), 31, 41), node, direction),
    values,
    intervalS,
    unit: unit === '' ? null : unit,
    ...startOf(record(3)),
    storage: storageOf(ordinate, littleEndian),
  };
}

function storageOf(ordinate: 2 | 4, littleEndian: boolean | null): UniversalStorage {
  if (littleEndian !== null)
    return { form: 'binary', number: { kind: 'float', bytes: ordinate === 2 ? 4 : 8, littleEndian } };
  return ordinate === 2
    ? { form: 'text', width: 13, valuesALine: 6 }
    : { form: 'text', width: 20, valuesALine: 4 };
}

/** Numbers by columns, the first wrong one remembered. A blank field is 0, as Fortran reads it. */
function fields(record: (number: number) => string) {
  const read = {
    wrong: null as string | null,
    whole(number: number, from: number, to: number): number {
      const written = record(number).slice(from, to).trim();
      return /^[+-]?\d+$|^$/.test(written) ? Number(written) : bad(number, written);
    },
    real(number: number, from: number, to: number): number {
      const written = record(number).slice(from, to).trim();
      const sound = /^[+-]?(\d+\.?\d*|\.\d+)([EeDd][+-]?\d{1,3})?$/.test(written);
      return sound ? Number(written.replace(/[Dd]/, 'E')) : bad(number, written);
    },
  };
  const bad = (number: number, written: string): number => {
    read.wrong ??= `record ${number}: '${written.replace(/[^ -~]/g, '?').slice(0, 20)}' is no number`;
    return Number.NaN;
  };
  return read;
}

/** Printable text of some columns; 'NONE' stands for nothing. */
function text(record: string, from: number, to: number): string {
  const found = record
    .slice(from, to)
    .replace(/[^ -~\u00a0-\u00ff]/g, '')
    .trim();
  return found.toUpperCase() === 'NONE' ? '' : found;
}

const axes = ['', 'X', 'Y', 'Z', 'rotation X', 'rotation Y', 'rotation Z'];

function responseName(entity: string, node: number, direction: number): string {
  const axis = axes[Math.abs(direction)] ?? '';
  const sign = direction < 0 ? '-' : '+';
  return [entity, node > 0 ? String(node) : '', axis === '' ? '' : sign + axis]
    .filter((part) => part !== '')
    .join(' ');
}

const months = ['JAN', 'FEB', 'MAR', 'APR', 'MAY', 'JUN', 'JUL', 'AUG', 'SEP', 'OCT', 'NOV', 'DEC'];

/**
 * Date and time of the third line, DD-MMM-YY HH:MM:SS, in the logger's clock. Years of two digits are 1970 to 2069, of
 * four as they stand.
 */
function startOf(line: string): Pick<TimeResponse, 'start' | 'startRefused'> {
  const written = text(line, 0, 80);
  const match = /^(\d{1,2})-([A-Za-z]{3})-(\d{2}|\d{4}) +(\d{1,2}):(\d\d):(\d\d)(?:\.(\d{1,6}))?$/.exec(
    written,
  );
  if (match === null) return { start: null, startRefused: written !== '' };
  const [, day, month = '', year = '', hour, minute, second] = match;
  const short = Number(year);
  const full = year.length === 4 ? short : short + (short < 70 ? 2000 : 1900);
  const monthNumber = months.indexOf(month.toUpperCase()) + 1;
  const whole =
    monthNumber === 0
      ? null
      : realDateMs(full, monthNumber, Number(day), Number(hour), Number(minute), Number(second));
  if (whole === null) return { start: null, startRefused: true };
  const ms = whole + Math.round(Number(`0.${match[7] ?? 0}`) * 1000);
  return { start: { ms, zoned: false, origin: 'header' }, startRefused: false };
}
