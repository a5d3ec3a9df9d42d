import { readFully } from './byte-source.ts';
import type { ByteSource, Refusal } from './recording.ts';
import type { SampleNumber } from './sample-numbers.ts';

/** What stands ahead of the numbers. */
export interface NpyHeader {
  readonly number: SampleNumber;
  readonly fortranOrder: boolean;
  readonly shape: readonly number[];
  /** Where the numbers begin. */
  readonly dataOffset: number;
}

export const npyMagic = [0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59];
/** Real headers have 118 bytes; this leaves room for any that describes samples. */
const longestHeader = 65_536;

/**
 * The header of a NumPy array file (NEP 1, Kern 2007, and its later versions 2 and 3): magic, version, length, the text
 * of a dictionary. Null where the file ends within it. The text is read by a grammar of its own and never evaluated.
 */
export function npyHeader(source: ByteSource): NpyHeader | Refusal | null {
  const fixed = new Uint8Array(12);
  const count = readFully(source, 0, fixed);
  const damaged = (reason: string): Refusal => ({ refused: 'damaged', reason });
  if (npyMagic.some((byte, at) => at < count && fixed[at] !== byte)) return damaged('byte 0: no NPY file');
  const major = fixed[6];
  if (count > 6 && (major < 1 || major > 3)) {
    return { refused: 'unsupported', reason: `version ${major}.${fixed[7]} of NPY; 1, 2 and 3 are read` };
  }
  const lengthBytes = major === 1 ? 2 : 4;
  if (count < 8 + lengthBytes) return null;
  const view = new DataView(fixed.buffer);
  const length = major === 1 ? view.getUint16(8, true) : view.getUint32(8, true);
  if (length > longestHeader)
    return damaged(`byte 8: a header of ${length} bytes; at most ${longestHeader} are read`);
  const dataOffset = 8 + lengthBytes + length;
  if (source.size < dataOffset) return null;
  const bytes = new Uint8Array(length);
  if (readFully(source, 8 + lengthBytes, bytes) < length) return null;
  // Names and numbers of a header are plain; what is not shows in the message only.
  const text = String.fromCharCode(...bytes.subarray(0, longestText)) + (length > longestText ? '\0' : '');
  const dictionary = readDictionary(text);
  if (typeof dictionary === 'string') return damaged(`header: ${dictionary}`);
  const { descr, fortran_order: fortranOrder, shape } = dictionary;
  if (typeof descr !== 'string' || typeof fortranOrder !== 'boolean' || !Array.isArray(shape))
    return damaged('header: descr, fortran_order or shape is missing or of another kind');
  const number = numberOf(descr);
  return 'refused' in number ? number : { number, fortranOrder, shape, dataOffset };
}

const longestText = 8192;

/** Stands for a `descr` that is a list. */
const recordOfFields = '[...]';

/** '<f4', '>i2', '|u1'. What is no real number of fixed size is refused with its name. */
function numberOf(descr: string): SampleNumber | Refusal {
  const match = /^([<>|])(f4|f8|[iu][1248])$/.exec(descr);
  if (match === null) {
    const shown =
      descr === recordOfFields ? 'a record of fields' : `'${descr.replace(/[^ -~]/g, '?').slice(0, 40)}'`;
    return {
      refused: 'unsupported',
      reason: `numbers of type ${shown}; f4, f8, i1 to i8, u1 to u8 are read: save the array as float32`,
    };
  }
  const [, order, type = ''] = match;
  const kind = type[0] === 'f' ? 'float' : type[0] === 'i' ? 'signed' : 'unsigned';
  return { kind, bytes: Number(type[1]) as SampleNumber['bytes'], littleEndian: order !== '>' };
}

type Value = string | boolean | readonly number[] | null;
interface Dictionary {
  readonly [key: string]: Value;
}

/**
 * `{'descr': '<f4', 'fortran_order': False, 'shape': (2, 3), }` and blanks, keys in any order, once each. A list as
 * `descr` (a record of fields) becomes the text '[...]'. Answers in words where the text is anything else.
 */
function readDictionary(text: string): Dictionary | string {
  const token = /\s*(?:'([^'\\\n]*)'|"([^"\\\n]*)"|(\d{1,16})L?|(True|False)|([{}():,[\]]))/y;
  const next = (): RegExpExecArray | null => token.exec(text);
  const mark = (): string | null => next()?.[5] ?? null;
  const found: Record<string, Value> = {};
  if (mark() !== '{') return 'it does not begin with {';
  for (;;) {
    const at = token.lastIndex;
    const key = next();
    if (key?.[5] === '}') break;
    const name = key?.[1] ?? key?.[2];
    if (name === undefined) return `a key is expected at its byte ${at}`;
    if (!['descr', 'fortran_order', 'shape'].includes(name)) return `an unknown key at its byte ${at}`;
    if (name in found) return `${name} stands in it twice`;
    if (mark() !== ':') return `: is expected behind ${name}`;
    const value = readValue(next);
    if (value === null) return `the value of ${name} cannot be read`;
    found[name] = value;
    const behind = mark();
    if (behind === '}') break;
    if (behind !== ',') return `, or } is expected behind ${name}`;
  }
  return /^[ \n]*$/.test(text.slice(token.lastIndex)) ? found : 'something stands behind its }';
}

const mostSides = 32;

function readValue(next: () => RegExpExecArray | null): Value {
  const first = next();
  if (first === null) return null;
  const text = first[1] ?? first[2];
  if (text !== undefined) return text;
  if (first[4] !== undefined) return first[4] === 'True';
  if (first[5] === '[') return readList(next) ? recordOfFields : null;
  return first[5] === '(' ? readTuple(next) : null;
}

function readTuple(next: () => RegExpExecArray | null): readonly number[] | null {
  const sides: number[] = [];
  for (;;) {
    const token = next();
    if (token?.[5] === ')') return sides;
    if (token?.[3] === undefined || sides.length === mostSides) return null;
    sides.push(Number(token[3]));
    const behind = next()?.[5];
    // (3) is a number in brackets, not a tuple of one side.
    if (behind === ')') return sides.length > 1 ? sides : null;
    if (behind !== ',') return null;
  }
}

/** To the bracket that closes it; what stands within is not wanted. */
function readList(next: () => RegExpExecArray | null): boolean {
  let open = 1;
  while (open > 0) {
    const token = next();
    if (token === null) return false;
    if (token[5] === '[' || token[5] === '(') open++;
    else if (token[5] === ']' || token[5] === ')') open--;
  }
  return true;
}
