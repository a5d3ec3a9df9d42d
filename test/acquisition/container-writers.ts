import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { File, ready } from 'h5wasm/node';

export const hdf5WriterReady = ready;

/** Recordings in the formats of analysts, as small as they can be: channels of equal length, values as they stand. */
type Channels = readonly Float64Array[];

const bytesOf = (text: string) => Uint8Array.from(text, (letter) => letter.charCodeAt(0));

/** NPY, version 1, doubles, samples x channels. */
export function npyBytes(channels: Channels): Uint8Array {
  const frames = channels[0]?.length ?? 0;
  const text = `{'descr': '<f8', 'fortran_order': False, 'shape': (${frames}, ${channels.length}), }`.padEnd(
    117,
  );
  const data = new DataView(new ArrayBuffer(8 * frames * channels.length));
  for (const [index, values] of channels.entries())
    for (const [frame, value] of values.entries())
      data.setFloat64(8 * (frame * channels.length + index), value, true);
  const head = [0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, 1, 0, 118, 0];
  return Uint8Array.from([...head, ...bytesOf(`${text}\n`), ...new Uint8Array(data.buffer)]);
}

/** Data sets 58 of doubles, a time response each, nodes from 1 on in direction +Z; as text or as bytes. */
export function universalBytes(channels: Channels, rateHz: number, form: 'text' | 'bytes'): Uint8Array {
  const parts = channels.map((values, index) => {
    const size = String(8 * values.length).padStart(12);
    const kind =
      form === 'text'
        ? '    58'
        : `    58b     1     2          11${size}     0     0           0           0`;
    const records = [
      '    -1',
      kind,
      ...['NONE', 'NONE', 'NONE', 'NONE', 'NONE'],
      `    1         0    0         0 NONE      ${String(index + 1).padStart(10)}   3 NONE               0   0`,
      `         4${String(values.length).padStart(10)}         1${real(0, 13, 5)}${real(1 / rateHz, 13, 5)}${real(0, 13, 5)}`,
      '        17    0    0    0 Time                 s',
      '        12    1    0    0 Acceleration         m/s2',
      '         0    0    0    0 NONE                 NONE',
      '         0    0    0    0 NONE                 NONE',
    ];
    const head = bytesOf(`${records.join('\n')}\n`);
    if (form === 'bytes') return [...head, ...new Uint8Array(values.slice().buffer), ...bytesOf('    -1\n')];
    const lines = Array.from({ length: Math.ceil(values.length / 4) }, (_, line) =>
      [...values.subarray(4 * line, 4 * line + 4)].map((value) => real(value, 20, 12)).join(''),
    );
    return [...head, ...bytesOf(`${lines.join('\n')}\n    -1\n`)];
  });
  return Uint8Array.from(parts.flat());
}

function real(value: number, width: number, digits: number): string {
  const [mantissa = '', exponent = ''] = value.toExponential(digits).split('e');
  return `${mantissa}E${exponent[0]}${exponent.slice(1).padStart(2, '0')}`.padStart(width);
}

/** HDF5: a group `fan` with a data set a channel, in chunks of 100 by gzip, its rate an attribute `fs` of the group. */
export async function hdf5Bytes(channels: Channels, rateHz: number): Promise<Uint8Array> {
  await hdf5WriterReady;
  return madeHdf5((file) => {
    const group = file.create_group('fan');
    for (const [index, values] of channels.entries())
      group.create_dataset({
        name: `ch${index + 1}`,
        data: values,
        shape: [values.length],
        chunks: [100],
        compression: 4,
      });
    group.create_attribute('fs', rateHz);
  });
}

/** A file that the package's own writer makes, once it is ready. */
export function madeHdf5(write: (file: File) => void): Uint8Array {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-hdf5-'));
  try {
    const path = join(folder, 'made.h5');
    const file = new File(path, 'w');
    write(file);
    file.close();
    return new Uint8Array(readFileSync(path));
  } finally {
    rmSync(folder, { recursive: true });
  }
}
