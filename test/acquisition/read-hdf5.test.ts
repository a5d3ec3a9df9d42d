import { readFileSync } from 'node:fs';
import type { File } from 'h5wasm/node';
import { beforeAll, beforeEach, describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { hdf5Library, mostHeapBytes, prepareHdf5 } from '../../src/acquisition/hdf5-library.ts';
import { hdf5Reader } from '../../src/acquisition/read-hdf5.ts';
import type { ByteSource } from '../../src/acquisition/recording.ts';
import { nothingSaid, type SampleLayout } from '../../src/config/sample-layout.ts';
import { hdf5WriterReady, madeHdf5 as made } from './container-writers.ts';
import { readAll, refusalOf, shortReads } from './read-all.ts';

beforeAll(async () => {
  await hdf5WriterReady;
});
beforeEach(() => prepareHdf5());

const stored = (name: string) =>
  new Uint8Array(readFileSync(new URL(`../files/recordings/${name}`, import.meta.url)));
const saying = (said: Partial<SampleLayout>): SampleLayout => ({ ...nothingSaid, ...said });
const header = (bytes: Uint8Array, said: Partial<SampleLayout> = {}) =>
  hdf5Reader.header(bytesSource(bytes), saying(said));
const ramp = (count: number, from = 0) => Float32Array.from({ length: count }, (_, n) => from + n);

describe('which samples are read', () => {
  const two = () =>
    made((file) => {
      const group = file.create_group('pump');
      group.create_dataset({ name: 'de', data: ramp(50) });
      group.create_dataset({ name: 'nde', data: ramp(50, 100) });
      group.create_dataset({ name: 'sides', data: ramp(50), shape: [25, 2] });
      group.create_group('more').create_dataset({ name: 'deep', data: ramp(7) });
      file.create_dataset({ name: 'words', data: ['a', 'b'] });
    });

  test('the one that the site file names', () => {
    expect(readAll(hdf5Reader, two(), saying({ dataset: '/pump/nde' })).channels).toEqual([
      [...ramp(50, 100)],
    ]);
    const sides = readAll(hdf5Reader, two(), saying({ dataset: '/pump/sides', channelsIn: 'rows' }));
    expect(sides.channels.slice(0, 2)).toEqual([
      [0, 1],
      [2, 3],
    ]);
  });

  test('those of one dimension in a group, each a channel of its name', () => {
    const { header, channels } = readAll(hdf5Reader, two(), saying({ dataset: '/pump' }));
    expect(header).toMatchObject({ channelNames: ['de', 'nde'], framesClaimed: 50, complete: true });
    expect(channels).toEqual([[...ramp(50)], [...ramp(50, 100)]]);
  });

  test('without a name the only one that there is, and none of several', () => {
    const one = made((file) => {
      file.create_dataset({ name: 'words', data: ['a', 'b'] });
      file.create_group('a').create_dataset({ name: 'b', data: ramp(5) });
    });
    expect(readAll(hdf5Reader, one).channels).toEqual([[...ramp(5)]]);
    expect(header(two())).toEqual({
      refused: 'unsupported',
      reason:
        '4 data sets in it (/pump/de, /pump/more/deep, /pump/nde, /pump/sides); say which: dataset: /pump/de, or the group whose data sets are the channels',
    });
  });

  test.each([
    ['/fan', 'no /fan in it, but /pump/de, /pump/more/deep, /pump/nde, /pump/sides'],
    ['/words', '/words: it holds no plain numbers'],
    ['/pump/more/deep/er', 'no /pump/more/deep/er in it, but '],
    ['/', '/: a group without data sets of one dimension'],
  ])('%s is refused with what there is', (dataset, reason) => {
    expect(header(two(), { dataset })).toMatchObject({
      refused: 'unsupported',
      reason: expect.stringContaining(reason),
    });
  });

  test('channels that are not equally long, or integers beside floats, are no one recording', () => {
    const lengths = made((file) => {
      file.create_dataset({ name: 'a', data: ramp(5) });
      file.create_dataset({ name: 'b', data: ramp(6) });
    });
    expect(header(lengths, { dataset: '/' })).toMatchObject({
      reason: expect.stringContaining('/b has 6 values, /a 5'),
    });
    const kinds = made((file) => {
      file.create_dataset({ name: 'a', data: ramp(5) });
      file.create_dataset({ name: 'b', data: new Int16Array(5) });
    });
    expect(header(kinds, { dataset: '/' })).toMatchObject({
      reason: expect.stringContaining('integers beside floats'),
    });
  });
});

describe('the sample rate', () => {
  const withRate = (set: (file: File) => void) =>
    made((file) => {
      const group = file.create_group('a');
      group.create_dataset({ name: 'x', data: ramp(5) });
      group.create_dataset({ name: 'y', data: ramp(5) });
      set(file);
    });
  const at = (file: File, path: string) => {
    const found = file.get(path);
    if (found === null || !('create_attribute' in found)) throw new Error(`no ${path}`);
    return found;
  };
  const said = { dataset: '/a/x', sampleRateAttribute: 'fs' };

  test.each([
    ['the data set', (file: File) => at(file, 'a/x').create_attribute('fs', 25_600.5), 25_600.5],
    [
      'the group above it',
      (file: File) => at(file, 'a').create_attribute('fs', new Int32Array([2560])),
      2560,
    ],
    ['the root', (file: File) => file.create_attribute('fs', '12800'), 12_800],
  ])('from an attribute of %s', (_, set, rate) => {
    expect(header(withRate(set), said)).toMatchObject({ sampleRateHz: rate, remarks: [] });
  });

  test.each([
    ['is not there', () => {}, 'no attribute fs of one number at /a/x or above it'],
    [
      'is no number',
      (file: File) => file.create_attribute('fs', 'fast'),
      'its attribute fs is no sample rate in Hz',
    ],
    [
      'is not above 0',
      (file: File) => file.create_attribute('fs', -1),
      'its attribute fs is no sample rate in Hz',
    ],
    [
      'is several',
      (file: File) => file.create_attribute('fs', new Float64Array([1, 2])),
      'no attribute fs of one number at /a/x or above it',
    ],
  ])('is left to the site file where the attribute %s, and that is said', (_, set, remark) => {
    expect(header(withRate(set), said)).toMatchObject({ sampleRateHz: null, remarks: [remark] });
  });

  test('the data sets of a group agree on it', () => {
    const apart = withRate((file) => {
      at(file, 'a/x').create_attribute('fs', 1000);
      at(file, 'a/y').create_attribute('fs', 2000);
    });
    expect(header(apart, { ...said, dataset: '/a' })).toMatchObject({
      sampleRateHz: null,
      remarks: ['its data sets differ in fs, no sample rate is taken from it'],
    });
    expect(header(apart, { ...said, dataset: '/a/y' })).toMatchObject({ sampleRateHz: 2000 });
  });
});

describe('memory and reads are bounded', () => {
  test("the library's heap does not grow beyond its bound, whatever is asked of it", () => {
    const library = hdf5Library();
    expect(library._malloc(mostHeapBytes)).toBe(0);
    const pointer = library._malloc(mostHeapBytes / 2);
    expect(pointer).toBeGreaterThan(0);
    library._free(pointer);
    expect(library.HEAPU8.length).toBeLessThanOrEqual(mostHeapBytes);
  });

  test('chunks and steps beyond the bound are refused with what to do', () => {
    expect(refusalOf(hdf5Reader, stored('long-chunks.h5'))?.reason).toBe(
      '/x: chunks of 40000000 bytes; at most 33554432 are read: save it in smaller chunks',
    );
    const wide = made((file) => {
      const group = file.create_group('g');
      for (let n = 0; n < 9; n++)
        group.create_dataset({
          name: `c${n}`,
          data: new Int8Array(500_000),
          shape: [500_000],
          chunks: [500_000],
          compression: 1,
        });
    });
    expect(refusalOf(hdf5Reader, wide, saying({ dataset: '/g' }))?.reason).toContain(
      'chunks of 500000 samples of 9 channels; at most 4194304 samples are read at a time',
    );
  });

  test('more samples than the file can hold are not read', () => {
    expect(refusalOf(hdf5Reader, stored('promises-much.h5'))).toMatchObject({
      refused: 'damaged',
      reason: expect.stringContaining('promises 8000000000000 bytes'),
    });
  });

  test('a long recording comes in small blocks, each chunk unpacked once', () => {
    const frames = 300_000;
    const bytes = made((file) => {
      const data = Float32Array.from({ length: 2 * frames }, (_, n) => Math.sin(n / 50));
      file.create_dataset({ name: 'x', data, shape: [frames, 2], chunks: [7000, 2], compression: 4 });
    });
    let given = 0;
    const inner = bytesSource(bytes);
    const source: ByteSource = {
      size: inner.size,
      read(offset, into) {
        const count = inner.read(offset, into);
        given += count;
        return count;
      },
    };
    const head = hdf5Reader.header(source, nothingSaid);
    if ('refused' in head) throw new Error(head.reason);
    given = 0;
    let total = 0;
    let longest = 0;
    const blocks = hdf5Reader.samples(source, head, nothingSaid);
    for (const { frames: count, firstFrame, channels } of blocks) {
      expect(firstFrame).toBe(total);
      expect(channels[1]?.[count - 1]).toBeCloseTo(Math.sin((2 * (total + count) - 1) / 50), 6);
      total += count;
      longest = Math.max(longest, count);
    }
    expect(total).toBe(frames);
    expect(longest).toBeLessThanOrEqual(8192);
    expect(given).toBeLessThan(bytes.length + 300_000);
  });
});

describe('a damaged file', () => {
  const whole = stored('channels-of-a-group.h5');
  const said = saying({ dataset: '/fan', sampleRateAttribute: 'fs' });
  const sound = () =>
    readAll(hdf5Reader, shortReads(whole, 1000), said).channels.map((values) => values.length);

  test('cut anywhere waits, and is damaged in the end', async () => {
    for (let length = 0; length < whole.length; length += 61) {
      await prepareHdf5();
      const part = bytesSource(whole.slice(0, length));
      expect(hdf5Reader.header(part, said), `${length} bytes`).toMatchObject({ complete: false });
      expect(refusalOf(hdf5Reader, whole.slice(0, length), said)).toMatchObject({
        refused: 'damaged',
        reason: expect.stringMatching(/the file ends/),
      });
    }
  });

  test('leaves the next one readable: its checksum wrong, its addresses elsewhere, its instance out of memory', async () => {
    const chunk = whole.slice();
    chunk[chunk.length - 900] = (chunk[chunk.length - 900] as number) ^ 0x55;
    const address = whole.slice().fill(0xee, 60, 200);
    for (const spoilt of [chunk, address]) {
      await prepareHdf5();
      expect(refusalOf(hdf5Reader, spoilt, said)).toMatchObject({
        refused: 'damaged',
        reason: expect.stringMatching(/^the HDF5 library cannot read it: [ -~]{5,200}$/),
      });
      await prepareHdf5();
      expect(sound()).toEqual([700, 700, 700]);
    }
    hdf5Library()._malloc(mostHeapBytes - hdf5Library().HEAPU8.length);
    const starved = refusalOf(hdf5Reader, whole, said);
    if (starved !== null) expect(starved.refused).toBe('damaged');
    await prepareHdf5();
    expect(sound()).toEqual([700, 700, 700]);
  });

  test('or one that is left half way, too', async () => {
    const source = bytesSource(whole);
    const head = hdf5Reader.header(source, said);
    if ('refused' in head) throw new Error(head.reason);
    const blocks = hdf5Reader.samples(source, head, said);
    blocks.next();
    blocks.return({ refused: 'damaged', reason: 'left' });
    await prepareHdf5();
    expect(sound()).toEqual([700, 700, 700]);
  });

  test('a disk that fails says nothing against the file', () => {
    let reads = 0;
    const failing: ByteSource = {
      size: whole.length,
      read(offset, into) {
        if (++reads > 4) throw new Error('the disk is gone');
        return bytesSource(whole).read(offset, into);
      },
    };
    expect(() => hdf5Reader.header(failing, said)).toThrow('the disk is gone');
  });

  test('still open for writing waits', () => {
    const open = whole.slice();
    // The flags of the third version of the superblock.
    open[11] = 5;
    expect(hdf5Reader.header(bytesSource(open), said)).toMatchObject({
      complete: false,
      remarks: ['its writer has not closed it'],
    });
  });
});
