import { createHash } from 'node:crypto';
import { closeSync, fstatSync, mkdtempSync, openSync, readSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import fc from 'fast-check';
import { expect, test } from 'vitest';
import { bytesSource, hashingSource, readFully, readHead } from '../../src/acquisition/byte-source.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import type { ByteSource } from '../../src/acquisition/recording.ts';
import { readAll, shortReads } from './read-all.ts';
import { bext, wavFile } from './wav-writer.ts';

const sha256 = (bytes: Uint8Array): string => createHash('sha256').update(bytes).digest('hex');
const counting = (length: number): Uint8Array =>
  Uint8Array.from({ length }, (_, index) => index * 37 + (index >> 8));

test('a read returns what is there, and nothing outside the bytes', () => {
  const source = bytesSource(Uint8Array.of(1, 2, 3, 4, 5));
  const into = new Uint8Array(3);
  expect(source.read(3, into)).toBe(2);
  expect([...into]).toEqual([4, 5, 0]);
  expect(source.read(5, into)).toBe(0);
  expect(source.read(-1, into)).toBe(0);
});

test('short reads are put together, and a file that grows is read as long as it was', () => {
  const bytes = counting(1000);
  const into = new Uint8Array(700);
  expect(readFully(shortReads(bytes, 7), 100, into)).toBe(700);
  expect(into).toEqual(bytes.subarray(100, 800));
  const grown: ByteSource = { size: 500, read: bytesSource(bytes).read };
  expect(readFully(grown, 100, into)).toBe(400);
  expect(readHead(grown).length).toBe(500);
});

test('every byte goes to the hash once and in order, however the file is read', () => {
  const reads = fc.array(fc.tuple(fc.nat(150_000), fc.nat(5000)), { maxLength: 30 });
  fc.assert(
    fc.property(fc.nat(140_000), reads, fc.integer({ min: 1, max: 90_000 }), (size, plan, most) => {
      const bytes = counting(size);
      const given: Uint8Array[] = [];
      const source = hashingSource(shortReads(bytes, most), (part) => given.push(part.slice()));
      for (const [offset, length] of plan) {
        const into = new Uint8Array(length);
        const count = source.read(offset, into);
        expect(into.subarray(0, count)).toEqual(bytes.subarray(offset, offset + count));
      }
      expect(source.finish()).toBe(size);
      expect(source.finish()).toBe(size);
      expect(Buffer.concat(given).equals(bytes)).toBe(true);
    }),
    { seed: 20261201, numRuns: 150 },
  );
});

test('bytes that appear behind the opened size are neither read nor hashed', () => {
  const bytes = counting(300);
  const hash = createHash('sha256');
  const source = hashingSource({ size: 200, read: bytesSource(bytes).read }, (part) => hash.update(part));
  expect(source.read(150, new Uint8Array(100))).toBe(50);
  expect(source.finish()).toBe(200);
  expect(hash.digest('hex')).toBe(sha256(bytes.subarray(0, 200)));
});

test('a file that shrank while it was read ends the hash without an endless loop', () => {
  const bytes = counting(100);
  let given = 0;
  const source = hashingSource({ size: 5000, read: bytesSource(bytes).read }, (part) => {
    given += part.length;
  });
  expect(source.read(4000, new Uint8Array(10))).toBe(0);
  expect(source.finish()).toBe(100);
  expect(given).toBe(100);
});

test('hash and samples of a real file come from one pass over it', () => {
  const folder = mkdtempSync(join(tmpdir(), 'byte-source-'));
  try {
    const file = join(folder, 'one.wav');
    const bytes = wavFile({ data: counting(300_000), after: [bext('2026-03-01', '06:00:00')] });
    writeFileSync(file, bytes);
    const descriptor = openSync(file, 'r');
    let read = 0;
    const disk: ByteSource = {
      size: fstatSync(descriptor).size,
      read(offset, into) {
        const count = readSync(descriptor, into, 0, into.length, offset);
        read += count;
        return count;
      },
    };
    const header = wavReader.header(disk);
    if ('refused' in header) throw new Error(header.reason);
    read = 0;
    const hash = createHash('sha256');
    const source = hashingSource(disk, (part) => hash.update(part));
    let frames = 0;
    for (const block of wavReader.samples(source, header)) frames += block.frames;
    source.finish();
    closeSync(descriptor);
    expect(frames).toBe(150_000);
    expect(hash.digest('hex')).toBe(sha256(bytes));
    expect(read).toBeLessThan(bytes.length + 200);
    expect(readAll(wavReader, bytes).header.start?.ms).toBe(Date.UTC(2026, 2, 1, 6));
  } finally {
    rmSync(folder, { recursive: true });
  }
});
