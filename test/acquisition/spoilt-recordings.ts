import type { SampleLayout } from '../../src/config/sample-layout.ts';
import { seededRandom } from '../signal/random.ts';
import { bext, letters, type WavParts, wavFile } from './wav-writer.ts';

/**
 * Recordings that are spoilt in the ways in which files are spoilt on the way (bytes lost, doubled, zeroed, exchanged, cut
 * off) and in the ways in which a wrong or hostile writer spoils them (fields of extreme value, numbers that are none,
 * pieces of other files). Number n of a seed is the same file in every run, whatever came before it.
 */
export interface Spoilt {
  readonly fileName: string;
  readonly bytes: Uint8Array;
  /** What the site file says of the place of its samples. */
  readonly layout?: SampleLayout;
}

export interface Dice {
  uniform(): number;
  below(limit: number): number;
  pick<T>(of: readonly T[]): T;
}

export function dice(seed: number): Dice {
  const { uniform } = seededRandom(seed);
  const below = (limit: number) => Math.floor(uniform() * limit);
  return { uniform, below, pick: (of) => of[below(of.length)] };
}

const tone = (index: number) => Math.sin(index / 3) + 0.1 * Math.sin(index * 1.7);

function integers(bytes: number, bits: number): Uint8Array {
  const data = new Uint8Array(bytes);
  const width = bits / 8;
  for (let at = 0; at + width <= bytes; at += width) {
    let value = Math.round(0.4 * tone(at / width) * 2 ** (bits - 1));
    for (let byte = 0; byte < width; byte++, value >>= 8) data[at + byte] = value & 255;
  }
  return data;
}

function floats(frames: number, bits: 32 | 64): Uint8Array {
  const view = new DataView(new ArrayBuffer((frames * bits) / 8));
  for (let index = 0; index < frames; index++) {
    if (bits === 32) view.setFloat32(4 * index, tone(index), true);
    else view.setFloat64(8 * index, tone(index), true);
  }
  return new Uint8Array(view.buffer);
}

function wavs(): Uint8Array[] {
  const before = [{ id: 'LIST', payload: letters('INFOabc') }, bext('2026-03-01', '06:00:00')];
  const forms: WavParts[] = [
    { data: integers(1200, 16), rateHz: 2560 },
    { data: integers(2400, 16), channels: 3, rateHz: 2560, before },
    { data: integers(1800, 24), bits: 24, validBits: 20, rateHz: 5120, after: before },
    { data: integers(600, 16), bits: 8, rateHz: 1000 },
    { data: integers(2000, 32), bits: 32, channels: 2, rateHz: 51_200 },
    { data: floats(500, 32), code: 3, bits: 32, rateHz: 2560 },
    { data: floats(400, 64), code: 3, bits: 64, rateHz: 2560 },
  ];
  return (['RIFF', 'RIFX', 'RF64', 'BW64'] as const).flatMap((id) =>
    forms.map((form) => wavFile({ ...form, id })),
  );
}

function csvs(): Uint8Array[] {
  const table = (rows: number, write: (index: number) => string) =>
    Array.from({ length: rows }, (_, index) => write(index)).join('');
  const comma = (value: number) => value.toFixed(4).replace('.', ',');
  return [
    `Time (s),DE [m/s2]\n${table(200, (i) => `${(i / 2560).toFixed(7)},${tone(i).toFixed(5)}\n`)}`,
    `Zeit;A;B\r\ns;g;g\r\n${table(120, (i) => `${comma(i / 1000)};${comma(tone(i))};${comma(-tone(i))}\r\n`)}`,
    `# remark\n${table(100, (i) => `${tone(i)}\t"${i}"\t\t${tone(i)}e-3\n`)}`,
    `date/time,x\n${table(59, (i) => `2026-03-01T06:00:${String(i).padStart(2, '0')}.5Z,${tone(i)}\n`)}`,
    table(150, (i) => ` ${tone(i).toFixed(3)}   ${-i}  nan\n`),
    `\ufeffa\r${table(300, (i) => `${tone(i)}\r`)}`,
  ].map((text) => new TextEncoder().encode(text));
}

/** What the spoiling begins with, each with the name by which its format is known. */
const originals: readonly Spoilt[] = [
  ...wavs().map((bytes) => ({ fileName: 'blower-1_a.wav', bytes })),
  ...csvs().map((bytes) => ({ fileName: 'blower-1_a.csv', bytes })),
];

const words32 = [0, 1, 2, 3, 0x7f, 0xff, 0xffff, 0x10000, 0x7fffffff, 0x80000000, 0xfffffffe, 0xffffffff];
/** NaN, infinities, the smallest and the greatest numbers, minus zero. */
const numbers64 = [
  Number.NaN,
  Infinity,
  -Infinity,
  5e-324,
  Number.MAX_VALUE,
  -Number.MAX_VALUE,
  -0,
  1e300,
  1e-300,
  2 ** 53,
];
const wordsOfText = [
  ...['nan', 'inf', '-inf', '1e400', '-1e400', '1e-400', '0x10', '1_000', '.', '-', '+', 'e5', '1e'],
  ...['"', '""', '\0', '\r', '\n', '\r\n\r\n', ',', ';', '\t', ' ', '\ufeff', '\u2212', '1.2.3', '1,2,3'],
  ...['99999999999999999999999', '2026-02-30T25:61:61Z', '2026-03-01T06:00:00+99:99', '#', 'a'.repeat(300)],
].map((word) => new TextEncoder().encode(word));
const chunkNames = ['fmt ', 'data', 'bext', 'ds64', 'LIST', 'RIFF', 'RF64', '\0\0\0\0', 'abcd'].map(letters);

export type Spoil = (bytes: Uint8Array, dice: Dice) => Uint8Array;

export function replaced(bytes: Uint8Array, at: number, length: number, by: Uint8Array): Uint8Array {
  const rest = bytes.subarray(at + length);
  const all = new Uint8Array(at + by.length + rest.length);
  all.set(bytes.subarray(0, at));
  all.set(by, at);
  all.set(rest, at + by.length);
  return all;
}

/** Early bytes are the likeliest: there lie the headers. */
function place(bytes: Uint8Array, { uniform, below }: Dice): number {
  return uniform() < 0.6 ? below(Math.min(90, bytes.length)) : below(bytes.length);
}

const length = ({ uniform, below }: Dice) => 1 + below(uniform() < 0.8 ? 8 : 300);

/** Overwrites `by` where it fits; the length stays. */
export function over(bytes: Uint8Array, at: number, by: Uint8Array): Uint8Array {
  const from = Math.max(0, Math.min(at, bytes.length - by.length));
  return by.length > bytes.length ? bytes : replaced(bytes, from, by.length, by);
}

function field(value: number | bigint, kind: 'u16' | 'u32' | 'f32' | 'f64', little: boolean): Uint8Array {
  const view = new DataView(new ArrayBuffer(kind === 'u16' ? 2 : kind === 'f64' ? 8 : 4));
  if (kind === 'u16') view.setUint16(0, Number(value), little);
  else if (kind === 'u32') view.setUint32(0, Number(value), little);
  else if (kind === 'f32') view.setFloat32(0, Number(value), little);
  else view.setFloat64(0, Number(value), little);
  return new Uint8Array(view.buffer);
}

export const spoils: readonly Spoil[] = [
  (bytes, d) => over(bytes, place(bytes, d), Uint8Array.of(d.below(256))),
  (bytes, d) => {
    const at = place(bytes, d);
    return over(bytes, at, Uint8Array.of(bytes[at] ^ (1 << d.below(8))));
  },
  (bytes, d) => over(bytes, place(bytes, d), field(d.pick(words32), d.pick(['u16', 'u32']), d.below(4) > 0)),
  (bytes, d) => over(bytes, place(bytes, d) & ~1, field(d.below(100_000), 'u32', d.below(4) > 0)),
  (bytes, d) =>
    over(bytes, place(bytes, d), field(d.pick(numbers64), d.pick(['f32', 'f64']), d.below(4) > 0)),
  (bytes, d) => over(bytes, place(bytes, d), d.pick(chunkNames)),
  (bytes, d) => over(bytes, place(bytes, d), new Uint8Array(length(d)).fill(d.pick([0, 255, 0x20, 0x39]))),
  (bytes, d) => replaced(bytes, place(bytes, d), length(d), new Uint8Array(0)),
  (bytes, d) => replaced(bytes, place(bytes, d), 0, bytes.slice(d.below(bytes.length)).slice(0, length(d))),
  (bytes, d) => replaced(bytes, place(bytes, d), d.below(3), d.pick(wordsOfText)),
  (bytes, d) => bytes.slice(0, d.below(bytes.length)),
  (bytes, d) => bytes.slice(0, Math.max(0, bytes.length - length(d))),
  (bytes, d) => {
    const other = d.pick(originals).bytes;
    const from = d.below(other.length);
    return replaced(bytes, d.below(bytes.length), length(d), other.slice(from, from + length(d)));
  },
  (bytes, d) => {
    // The samples all one value: nothing, a constant, or not a number.
    const spoilt = bytes.slice();
    const from = Math.min(bytes.length, d.pick([44, 60, 100]));
    return spoilt.fill(d.pick([0, 0x80, 0xff, 0x7f]), from, Math.max(from, bytes.length - d.below(40)));
  },
];

/** One that nobody has touched, of every form in turn. */
export function wholeRecording(number: number): Spoilt {
  return originals[number % originals.length];
}

export function spoiltRecording(seed: number, number: number): Spoilt {
  const d = dice(seed * 1e7 + number);
  const { fileName, bytes: original } = d.pick(originals);
  let bytes = original;
  for (let count = 1 + d.below(5); count > 0 && bytes.length > 1; count--) bytes = d.pick(spoils)(bytes, d);
  return { fileName: d.below(20) === 0 ? 'blower-1_a.wav' : fileName, bytes };
}

const sidecars = [
  '{ "start": "2026-11-03T09:30:00Z", "speed_rpm": 1480, "load_percent": 75, "running": true }',
  '{"channels": {"1": {"samples_in": "V", "full_scale": "10 V", "sensitivity": "100 mV/g"}, "A": {"full_scale": 5}}}',
  '{ "speed_rpm": 2.98e3, "channels": { "1": { "samples_in": "mm/s" } } }',
].map((text) => new TextEncoder().encode(text));
const jsonWords = [
  ...[
    '{',
    '}',
    '[',
    ']',
    '"',
    ':',
    ',',
    'null',
    'true',
    '-1',
    '1e999',
    '-0',
    '1e-320',
    '[[[[[[',
    '"__proto__":1,',
  ],
  ...[
    '"start":null,',
    '"\\u0000"',
    '\u2028',
    '\ud800',
    '/*x*/',
    'NaN',
    '"1e300 V"',
    '"1e-300 V/(m/s2)"',
    '"0 V"',
  ],
].map((word) => new TextEncoder().encode(word));

/** Values in their right places, good, odd and hostile. */
const jsonValues: Readonly<Record<string, readonly string[]>> = {
  start: [
    '"2026-11-03T09:30:00Z"',
    '"2026-11-03 09:30"',
    '"-271821-04-20T00:00:00Z"',
    '"2026-02-31T00:00:00Z"',
    'null',
    '7',
  ],
  speed_rpm: ['1480', '0', '-0', '1e-320', '1000000', '1e6', '1e999', '-1', '1000001', '"1480"', 'null'],
  load_percent: ['75', '-1000', '1000', '1e308', '{}'],
  running: ['true', 'false', '0', 'null'],
  channels: [
    ...['{}', '[]', '{"1":{}}', '{"1":{"full_scale":5e-324}}', '{"1":{"full_scale":1.7e308}}'],
    ...['{"1":{"samples_in":"V","full_scale":"10 V","sensitivity":"100 mV/g"}}', '{"A":{"samples_in":"um"}}'],
    ...[
      '{"1":{"samples_in":"V","sensitivity":"1e-300 V/g"}}',
      '{"1":{"samples_in":"V","sensitivity":"1e300 V/g"}}',
    ],
    ...[
      '{"1":{"samples_in":"g"},"__proto__":{}}',
      '{"constructor":{"full_scale":1}}',
      '{"1":{"full_scale":"1e305 km"}}',
    ],
  ],
};

export function spoiltSidecar(seed: number, number: number): Uint8Array {
  const d = dice(seed * 1e7 + number);
  const fields = Object.entries(jsonValues).filter(() => d.below(2) === 0);
  const text = `{${fields.map(([key, values]) => `"${key}":${d.pick(values)}`).join(',')}}`;
  let bytes: Uint8Array = d.below(4) === 0 ? d.pick(sidecars) : new TextEncoder().encode(text);
  for (let count = d.below(3); count > 0 && bytes.length > 1; count--) {
    const at = d.below(bytes.length);
    bytes = d.below(2) === 0 ? replaced(bytes, at, d.below(12), d.pick(jsonWords)) : d.pick(spoils)(bytes, d);
  }
  return bytes;
}

const nameParts = [
  ...[
    'blower-1_',
    'blower-2_',
    '20260302T060000Z',
    '_',
    '.wav',
    '.csv',
    '.json',
    '.part',
    '.',
    '..',
    '/',
    '~1a2b3c4d',
  ],
  ...[
    'bytes:',
    '.reason.txt',
    '.humledger-',
    '\n',
    '\0',
    '\u202e',
    '\u2028',
    '\u00e9',
    '\ud83d\ude00',
    ' ',
    '\\',
    '"',
  ],
  ...['=1+1', '<b>', '%2e%2e', '20269999T999999Z', 'a'.repeat(120), 'A', '\u0130', '-', '~'],
].map((part) => new TextEncoder().encode(part));

/** Bytes of one name of a folder, which holds neither a slash nor a zero. */
export function hostileName(seed: number, number: number): Uint8Array {
  const d = dice(seed * 1e7 + number);
  const parts = Array.from({ length: 1 + d.below(7) }, () =>
    d.below(6) === 0
      ? Uint8Array.from({ length: 1 + d.below(6) }, () => 1 + d.below(255))
      : d.pick(nameParts),
  );
  if (d.below(4) === 0) {
    parts.unshift(nameParts[0]);
    parts.push(nameParts[4]);
  }
  const bytes = Uint8Array.from(parts.flatMap((part) => [...part])).filter(
    (byte) => byte !== 0 && byte !== 0x2f,
  );
  return bytes.length === 0 || /^\.{1,2}$/.test(Buffer.from(bytes).toString('latin1'))
    ? Uint8Array.of(97)
    : bytes;
}
