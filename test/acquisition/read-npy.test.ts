import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { npyReader } from '../../src/acquisition/read-npy.ts';
import { isRefusal, type RecordingHeader } from '../../src/acquisition/recording.ts';
import { nothingSaid } from '../../src/config/sample-layout.ts';
import { readAll, refusalOf, shortReads, wholeChannels } from './read-all.ts';

const types = ['f4', 'f8', 'i1', 'i2', 'i4', 'i8', 'u1', 'u2', 'u4', 'u8'] as const;
type NumberType = (typeof types)[number];

function numbersAsBytes(values: readonly number[], type: NumberType, little: boolean): Uint8Array {
  const width = Number(type[1]);
  const view = new DataView(new ArrayBuffer(values.length * width));
  for (const [index, value] of values.entries()) {
    const at = index * width;
    if (type === 'f4') view.setFloat32(at, value, little);
    else if (type === 'f8') view.setFloat64(at, value, little);
    else if (width === 8) view.setBigUint64(at, BigInt.asUintN(64, BigInt(value)), little);
    else if (width === 4) view.setUint32(at, value, little);
    else if (width === 2) view.setUint16(at, value, little);
    else view.setUint8(at, value);
  }
  return new Uint8Array(view.buffer);
}

function npy(header: string, data: Uint8Array, major: 1 | 2 | 3 = 1): Uint8Array {
  const text = new TextEncoder().encode(header);
  const lengthBytes = major === 1 ? 2 : 4;
  const bytes = new Uint8Array(8 + lengthBytes + text.length + data.length);
  bytes.set([0x93, 0x4e, 0x55, 0x4d, 0x50, 0x59, major, 0]);
  const view = new DataView(bytes.buffer);
  if (major === 1) view.setUint16(8, text.length, true);
  else view.setUint32(8, text.length, true);
  bytes.set(text, 8 + lengthBytes);
  bytes.set(data, 8 + lengthBytes + text.length);
  return bytes;
}

const plain = (shape: string, descr = '<f8', fortran = 'False') =>
  `{'descr': '${descr}', 'fortran_order': ${fortran}, 'shape': ${shape}, }\n`;
const floats = (count: number) =>
  numbersAsBytes(
    Array.from({ length: count }, (_, n) => n + 1),
    'f8',
    true,
  );

function headerOf(bytes: Uint8Array): RecordingHeader {
  const header = npyReader.header(bytesSource(bytes));
  if (isRefusal(header)) throw new Error(header.reason);
  return header;
}

describe('the numbers', () => {
  test('every type, in either byte order and either order of the sides, is the value that was written', () => {
    const shape = fc.record({
      frames: fc.integer({ min: 1, max: 40 }),
      channels: fc.integer({ min: 1, max: 5 }),
      type: fc.constantFrom(...types),
      little: fc.boolean(),
      fortran: fc.boolean(),
      rows: fc.boolean(),
      seed: fc.integer({ min: 1, max: 1000 }),
    });
    fc.assert(
      fc.property(shape, ({ frames, channels, type, little, fortran, rows, seed }) => {
        const bits = 8 * Number(type[1]);
        // As far apart as the type can hold, exact in a double.
        const step = type[0] === 'f' ? 0.25 : 2 ** Math.max(0, bits - 12);
        const lowest = type[0] === 'u' ? 0 : -(2 ** (bits - 1));
        const value = (frame: number, channel: number): number => {
          const turn = (seed * (frame + 1) + 7 * channel) % 2 ** Math.min(bits, 12);
          return type[0] === 'f' ? turn * step - 200 : lowest + turn * step;
        };
        const frameByFrame = rows === fortran;
        const values: number[] = [];
        for (let one = 0; one < (frameByFrame ? frames : channels); one++)
          for (let other = 0; other < (frameByFrame ? channels : frames); other++)
            values.push(frameByFrame ? value(one, other) : value(other, one));
        const sides = rows ? `(${channels}, ${frames})` : `(${frames}, ${channels})`;
        const descr = `${bits === 8 ? '|' : little ? '<' : '>'}${type}`;
        const file = npy(
          plain(sides, descr, fortran ? 'True' : 'False'),
          numbersAsBytes(values, type, little),
        );
        const { channels: read, header } = readAll(npyReader, shortReads(file, 13), {
          ...nothingSaid,
          channelsIn: rows ? 'rows' : 'columns',
        });
        expect(header.samples).toBe(type[0] === 'f' ? 'number' : 'integer');
        const full = 2 ** (bits - 1);
        const middle = type[0] === 'u' ? full : 0;
        for (let channel = 0; channel < channels; channel++)
          for (let frame = 0; frame < frames; frame++) {
            const written = value(frame, channel);
            expect(read[channel]?.[frame]).toBe(type[0] === 'f' ? written : (written - middle) / full);
          }
      }),
      { seed: 20261201, numRuns: 400 },
    );
  });

  test('integers reach from -1 to just below 1 of full scale', () => {
    const bytes = numbersAsBytes([-32_768, -1, 0, 1, 32_767], 'i2', true);
    expect(wholeChannels(npyReader, npy(plain('(5,)', '<i2'), bytes))).toEqual([
      [-1, -1 / 32_768, 0, 1 / 32_768, 32_767 / 32_768],
    ]);
    expect(wholeChannels(npyReader, npy(plain('(3,)', '|u1'), Uint8Array.of(0, 128, 255)))).toEqual([
      [-1, 0, 127 / 128],
    ]);
  });

  test('NaN and infinities are passed on for the quality to judge', () => {
    const bytes = numbersAsBytes([Number.NaN, Infinity, 1], 'f4', false);
    expect(wholeChannels(npyReader, npy(plain('(3,)', '>f4'), bytes))).toEqual([[Number.NaN, Infinity, 1]]);
  });

  test('blocks stay small, however the channels lie', () => {
    for (const fortran of ['False', 'True']) {
      const file = npy(plain('(90000, 3)', '<f8', fortran), floats(270_000));
      const { blocks, channels } = readAll(npyReader, file);
      expect(blocks).toBe(3);
      expect(channels.map((values) => values.length)).toEqual([90_000, 90_000, 90_000]);
      expect(channels[1]?.[2]).toBe(fortran === 'True' ? 90_003 : 8);
    }
  });
});

describe('the header', () => {
  test.each([
    ['as NumPy writes it', plain('(3,)')],
    ['keys in another order', "{'shape': (3,), 'fortran_order': False, 'descr': '<f8'}"],
    ['double quotes, no blanks', '{"descr":"<f8","fortran_order":False,"shape":(3,)}'],
    ['numbers of an older Python', plain('(3L,)')],
    ['a side of one', plain('(3, 1)').replace('(3, 1)', '(3, 1,)')],
  ])('is read: %s', (_, header) => {
    const layout = { ...nothingSaid, channelsIn: 'columns' } as const;
    expect(readAll(npyReader, npy(header, floats(3)), layout).channels).toEqual([[1, 2, 3]]);
    for (const major of [2, 3] as const)
      expect(readAll(npyReader, npy(header, floats(3), major), layout).channels).toEqual([[1, 2, 3]]);
  });

  test.each([
    ['no dictionary', '[3]', 'header: it does not begin with {'],
    [
      'a call',
      "{'descr': str('<f8'), 'fortran_order': False, 'shape': (3,)}",
      'header: the value of descr cannot be read',
    ],
    ['a sum', plain('(1+2,)'), 'header: the value of shape cannot be read'],
    ['a negative side', plain('(-3,)'), 'header: the value of shape cannot be read'],
    ['a number in brackets', plain('(3)'), 'header: the value of shape cannot be read'],
    ['a key twice', "{'shape': (3,), 'shape': (3,)}", 'header: shape stands in it twice'],
    ['a key of another kind', "{'colour': (3,)}", 'header: an unknown key at its byte 1'],
    [
      'a key too few',
      "{'descr': '<f8'}",
      'header: descr, fortran_order or shape is missing or of another kind',
    ],
    ['something behind it', `${plain('(3,)').trim()} import os`, 'header: something stands behind its }'],
    [
      'more than any file holds',
      plain('(9007199254740991,)'),
      'header: a shape of 9007199254740991 is more than any file holds',
    ],
  ])('is damaged: %s', (_, header, reason) => {
    expect(refusalOf(npyReader, npy(header, floats(3)))).toEqual({ refused: 'damaged', reason });
  });

  test('a length beyond the bound is refused before anything is allocated for it', () => {
    const file = npy(plain('(3,)'), floats(3), 2);
    new DataView(file.buffer).setUint32(8, 0xffff_fff0, true);
    expect(refusalOf(npyReader, file)?.reason).toBe(
      'byte 8: a header of 4294967280 bytes; at most 65536 are read',
    );
  });

  test('an absurd count of frames is promised, not allocated', () => {
    const header = headerOf(npy(plain('(1000000000000,)'), floats(3)));
    expect(header).toMatchObject({ complete: false, framesClaimed: 1e12 });
    const { end, channels } = readAll(npyReader, npy(plain('(1000000000000,)'), floats(3)));
    expect(channels).toEqual([[1, 2, 3]]);
    expect(end).toMatchObject({ frames: 3, truncated: expect.stringContaining('3 of 1000000000000') });
  });
});

describe('which side is that of the channels', () => {
  const header = (shape: string, channelsIn: 'columns' | 'rows' | null = null) =>
    npyReader.header(bytesSource(npy(plain(shape), floats(2050))), { ...nothingSaid, channelsIn });

  test('the one that is at most 1024 long while the other is longer', () => {
    expect(header('(1025, 2)')).toMatchObject({ framesClaimed: 1025, channelNames: ['1', '2'] });
    expect(header('(2, 1025)')).toMatchObject({ framesClaimed: 1025, channelNames: ['1', '2'] });
  });

  test('otherwise the one that the site file says, and without its word none', () => {
    expect(header('(1024, 2)', 'columns')).toMatchObject({ framesClaimed: 1024 });
    expect(header('(1024, 2)', 'rows')).toMatchObject({ framesClaimed: 2 });
    expect(header('(1024, 2)')).toMatchObject({
      refused: 'unsupported',
      reason: expect.stringContaining('channels_in: columns or channels_in: rows'),
    });
    expect(header('(1025, 2)', 'rows')).toMatchObject({
      refused: 'unsupported',
      reason: expect.stringContaining('is it the other way round?'),
    });
    expect(header('(1025, 1025)')).toMatchObject({ refused: 'unsupported' });
  });
});

describe('a file that is not all there', () => {
  const whole = new Uint8Array(
    readFileSync(new URL('../files/recordings/second-version.npy', import.meta.url)),
  );

  test('cut anywhere it waits, and gives the whole frames that it has', () => {
    for (let length = 0; length < whole.length; length++) {
      const part = whole.slice(0, length);
      expect(headerOf(part).complete, `${length} bytes`).toBe(false);
      if (length < 128) {
        expect(refusalOf(npyReader, part)?.refused).toBe('damaged');
        continue;
      }
      const { channels, end } = readAll(npyReader, part);
      expect(end).toMatchObject({ truncated: expect.stringMatching(/promised frames/) });
      expect(channels[0]).toEqual(
        wholeChannels(npyReader, whole)[0]?.slice(0, Math.floor((length - 128) / 8)),
      );
    }
  });

  test('of channels behind each other those frames that all of them have', () => {
    const file = npy(plain('(2, 1100)'), floats(2200));
    const { channels, end } = readAll(npyReader, file.slice(0, file.length - 8 * 100 - 3));
    expect(channels.map((values) => values.length)).toEqual([999, 999]);
    expect(end).toMatchObject({ frames: 999, truncated: expect.stringContaining('999 of 1100') });
  });

  test('of its full size over a tail of zeros it waits, and is then read', () => {
    const file = npy(plain('(1000,)'), floats(1000)).fill(0, 3900);
    expect(headerOf(file)).toMatchObject({ complete: false, zeroTail: true });
    expect(readAll(npyReader, file).end).toMatchObject({ frames: 1000, truncated: null });
    expect(headerOf(new Uint8Array(9000))).toMatchObject({ complete: false });
  });
});
