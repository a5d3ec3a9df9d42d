import { readFileSync } from 'node:fs';
import { nothingSaid, type SampleLayout } from '../../src/config/sample-layout.ts';
import { type Dice, dice, over, replaced, type Spoil, type Spoilt, spoils } from './spoilt-recordings.ts';

/**
 * Files of UFF 58, NPY and HDF5, spoilt as other recordings are and in ways of their own: lines lost, doubled, shifted or
 * exchanged, fields of extreme value where counts and sizes stand, addresses that lead elsewhere. Number n of a seed is
 * the same file in every run.
 */
export type Container = 'UFF 58' | 'NPY' | 'HDF5';

const originals: Readonly<Record<Container, readonly [string, Partial<SampleLayout>?][]>> = {
  'UFF 58': [
    ['one-response.uff'],
    ['two-responses.unv'],
    ['bytes.uff'],
    ['d-exponents.uff'],
    ['touching-columns.uff'],
  ],
  NPY: [
    ['two-columns.npy'],
    ['two-rows.npy'],
    ['fortran-columns.npy'],
    ['second-version.npy'],
    ['third-version.npy'],
    ['wide-integers.npy'],
    ['either-way.npy', { channelsIn: 'columns' }],
  ],
  HDF5: [
    ['one-data-set.h5', { sampleRateAttribute: 'sample_rate' }],
    ['channels-of-a-group.h5', { dataset: '/fan', sampleRateAttribute: 'fs' }],
    ['rows-in-chunks.h5', { channelsIn: 'rows' }],
    ['scale-and-offset.hdf5'],
  ],
};

const folder = new URL('../files/recordings/', import.meta.url);
const files = new Map(
  Object.values(originals).flatMap((list) =>
    list.map(([name]) => [name, new Uint8Array(readFileSync(new URL(name, folder)))] as const),
  ),
);

const text = (of: string) => new TextEncoder().encode(of);

/** Fields as wide as those of the records of data set 58, and what stands in them or should not. */
const fieldsOfText = [
  ...[
    '    -1',
    '    58',
    '    58b',
    '   164',
    '         1',
    '         0',
    '         5',
    '        -1',
    '2147483647',
  ],
  ...['4294967296', '  1.00000E+00', '  0.00000E+00', ' -1.00000E-05', '  1.00000E-99', '  1.000000+300'],
  ...['*************', '          NaN', '  NONE', '01-MAY-24 25:00:00', '29-FEB-23 12:00:00', '\r\n', '\n'],
].map(text);

const wordsOfHeader = [
  ...["'<f4'", "'<c8'", "'|O'", "'<f8'", "'>i2'", '(2,)', '(1, 2)', '(3)', '()', '(99999999999999999,)'],
  ...[
    '(1024, 1024)',
    '(0, 2)',
    '(-1,)',
    'True',
    'False',
    'None',
    "'shape': ",
    "'descr': ",
    '{',
    '}',
    '((',
    '[',
    ']',
  ],
  ...["__import__('os')", "\\'", '\n', ' '.repeat(40), '1e5', '0x10', '5L', "'shape': (4,), 'shape': (4,)"],
].map(text);

function lineStarts(bytes: Uint8Array): number[] {
  const starts = [0];
  for (let at = bytes.indexOf(10); at >= 0; at = bytes.indexOf(10, at + 1)) starts.push(at + 1);
  return starts;
}

/** A line, and where it stands. */
function line(bytes: Uint8Array, d: Dice): { readonly at: number; readonly bytes: Uint8Array } {
  const starts = lineStarts(bytes);
  // The records are the likelier, and there are few of them.
  const index = d.below(d.below(2) === 0 ? Math.min(15, starts.length) : starts.length);
  const at = starts[index] as number;
  return { at, bytes: bytes.slice(at, starts[index + 1] ?? bytes.length) };
}

function word64(value: bigint): Uint8Array {
  const view = new DataView(new ArrayBuffer(8));
  view.setBigUint64(0, BigInt.asUintN(64, value), true);
  return new Uint8Array(view.buffer);
}

const words64 = [0n, 1n, 8n, 512n, 2n ** 31n, 2n ** 32n, 2n ** 40n, 2n ** 53n, 2n ** 63n, -1n, -2n];

const ownSpoils: Readonly<Record<Container, readonly Spoil[]>> = {
  'UFF 58': [
    (bytes, d) => {
      const { at, bytes: lost } = line(bytes, d);
      return replaced(bytes, at, lost.length, new Uint8Array(0));
    },
    (bytes, d) => replaced(bytes, line(bytes, d).at, 0, line(bytes, d).bytes),
    (bytes, d) => over(bytes, line(bytes, d).at + 10 * d.below(6), d.pick(fieldsOfText)),
    (bytes, d) => replaced(bytes, line(bytes, d).at + d.below(30), 0, text(' '.repeat(1 + d.below(12)))),
    (bytes, d) => replaced(bytes, line(bytes, d).at, d.below(20), d.pick(fieldsOfText)),
  ],
  NPY: [
    (bytes, d) => over(bytes, 10 + d.below(70), d.pick(wordsOfHeader)),
    (bytes, d) => replaced(bytes, 10 + d.below(70), d.below(12), d.pick(wordsOfHeader)),
    (bytes, d) => over(bytes, 6, Uint8Array.of(d.below(5), d.below(3), d.below(256), d.below(3))),
  ],
  HDF5: [
    (bytes, d) => over(bytes, 8 * d.below(Math.min(300, bytes.length >> 3)), word64(d.pick(words64))),
    (bytes, d) => over(bytes, 8 * d.below(bytes.length >> 3), word64(BigInt(d.below(bytes.length)))),
    (bytes, d) => over(bytes, d.below(bytes.length), Uint8Array.of(d.below(256))),
    (bytes, d) => {
      const at = d.below(bytes.length);
      return over(bytes, at, Uint8Array.of(bytes[at] ^ (1 << d.below(8))));
    },
  ],
};

export function spoiltContainer(kind: Container, seed: number, number: number): Spoilt {
  const d = dice(seed * 1e7 + number);
  const [fileName, layout = {}] = d.pick(originals[kind]);
  let bytes = files.get(fileName) as Uint8Array;
  for (let count = 1 + d.below(3); count > 0 && bytes.length > 1; count--)
    bytes = d.pick(d.below(2) === 0 ? ownSpoils[kind] : spoils)(bytes, d);
  return { fileName, bytes, layout: { ...nothingSaid, ...layout } };
}
