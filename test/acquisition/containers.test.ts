import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { bytesSource, readHead } from '../../src/acquisition/byte-source.ts';
import { readerFor } from '../../src/acquisition/readers.ts';
import { isRefusal } from '../../src/acquisition/recording.ts';
import { nothingSaid, type SampleLayout } from '../../src/config/sample-layout.ts';
import { readAll } from './read-all.ts';

/** What numpy makes of each file (test/golden/make_containers.py). */
interface Held {
  readonly rate: number | null;
  readonly layout: Partial<SampleLayout>;
  readonly channels: readonly {
    readonly frames: number;
    readonly sum: number;
    readonly sumOfSquares: number;
    readonly first: number;
    readonly last: number;
  }[];
}

const golden = JSON.parse(
  readFileSync(new URL('../golden/containers.json', import.meta.url), 'utf8'),
) as Record<string, Held>;

describe('UFF 58, NPY and HDF5 give the values that other programs wrote', () => {
  test.each(Object.entries(golden))('%s', async (name, held) => {
    const bytes = new Uint8Array(readFileSync(new URL(`../files/recordings/${name}`, import.meta.url)));
    const reader = readerFor(readHead(bytesSource(bytes)), name);
    if (isRefusal(reader)) throw new Error(reader.reason);
    await reader.prepare?.();
    const { header, channels } = readAll(reader, bytes, { ...nothingSaid, ...held.layout });
    // An interval in a universal file has six significant digits.
    if (held.rate === null) expect(header.sampleRateHz).toBeNull();
    else expect(header.sampleRateHz).toBeCloseTo(held.rate, -Math.log10(held.rate * 1e-5));
    expect(channels.map((values) => values.length)).toEqual(held.channels.map(({ frames }) => frames));
    for (const [index, values] of channels.entries()) {
      const { sum, sumOfSquares, first, last } = held.channels[index] as Held['channels'][number];
      expect(values[0]).toBe(first);
      expect(values.at(-1)).toBe(last);
      expect(values.reduce((total, value) => total + value, 0)).toBeCloseTo(sum, 9);
      expect(values.reduce((total, value) => total + value * value, 0)).toBeCloseTo(sumOfSquares, 9);
    }
  });
});
