import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { csvReader } from '../../src/acquisition/read-csv.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { type ByteSource, isRefusal, type RecordingReader } from '../../src/acquisition/recording.ts';
import { seededRandom } from '../signal/random.ts';
import { readAll, shortReads, wholeChannels } from './read-all.ts';
import { bext, type Chunk, letters, type WavParts, wavFile } from './wav-writer.ts';

const seed = 20261201;

describe('what a writer wrote, the reader reads', () => {
  /** The plain second opinion: one sample at a time. */
  function plainValue(view: DataView, at: number, bits: number, float: boolean, little: boolean): number {
    if (float) return bits === 32 ? view.getFloat32(at, little) : view.getFloat64(at, little);
    if (bits === 8) return (view.getUint8(at) - 128) / 128;
    if (bits === 16) return view.getInt16(at, little) / 2 ** 15;
    if (bits === 32) return view.getInt32(at, little) / 2 ** 31;
    const [low, middle, high] = [0, 1, 2].map((index) => view.getUint8(at + (little ? index : 2 - index)));
    const value = low + middle * 2 ** 8 + high * 2 ** 16;
    return (value >= 2 ** 23 ? value - 2 ** 24 : value) / 2 ** 23;
  }

  const chunkOf: fc.Arbitrary<Chunk> = fc.oneof(
    fc.record({
      id: fc.constantFrom('LIST', 'JUNK', 'abcd', 'iXML'),
      payload: fc.uint8Array({ maxLength: 40 }),
    }),
    fc.constant(bext('2026-03-01', '06:00:00')),
  );
  const format = fc.constantFrom([1, 8], [1, 16], [1, 24], [1, 32], [3, 32], [3, 64]);
  const id = fc.constantFrom('RIFF', 'RIFX', 'RF64', 'BW64') as fc.Arbitrary<NonNullable<WavParts['id']>>;

  test('WAV of any format, byte order, number of channels, chunks around, reads of any size', () => {
    fc.assert(
      fc.property(
        fc.record({
          id,
          format,
          channels: fc.integer({ min: 1, max: 9 }),
          frames: fc.integer({ min: 1, max: 60 }),
        }),
        fc.array(chunkOf, { maxLength: 4 }),
        fc.array(chunkOf, { maxLength: 4 }),
        fc.integer({ min: 1, max: 700 }),
        fc.infiniteStream(fc.nat(255)),
        ({ id, format: [code, bits], channels, frames }, before, after, most, bytes) => {
          const frameBytes = (channels * bits) / 8;
          const data = Uint8Array.from(bytes.take(frames * frameBytes));
          const file = wavFile({ id, code, bits, channels, data, before, after });
          const view = new DataView(data.buffer);
          const expected = Array.from({ length: channels }, (_, channel) =>
            Array.from({ length: frames }, (_, frame) =>
              plainValue(view, frame * frameBytes + (channel * bits) / 8, bits, code === 3, id !== 'RIFX'),
            ),
          );
          expect(wholeChannels(wavReader, file)).toEqual(expected);
          const short = readAll(wavReader, shortReads(file, most));
          expect(short.channels).toEqual(expected);
          const dated = [...before, ...after].some((part) => part.id === 'bext');
          expect(short.header.start !== null).toBe(dated);
        },
      ),
      { seed, numRuns: 400 },
    );
  });

  const value = fc.oneof(
    fc.double({ noDefaultInfinity: true, noNaN: true }),
    fc.integer({ min: -5000, max: 5000 }).map((whole) => whole / 1000),
    fc.constantFrom(Number.NaN, Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY),
  );
  const styles = fc.constantFrom(
    [',', '.'],
    [';', '.'],
    [';', ','],
    ['\t', '.'],
    ['\t', ','],
    [' ', '.'],
    [' ', ','],
  );

  test('CSV of any delimiter, decimal mark, line end, headings, reads of any size', () => {
    fc.assert(
      fc.property(
        fc.integer({ min: 2, max: 6 }).chain((columns) =>
          fc.array(fc.array(value, { minLength: columns, maxLength: columns }), {
            minLength: 3,
            maxLength: 40,
          }),
        ),
        styles,
        fc.constantFrom('\n', '\r\n', '\r'),
        fc.boolean(),
        fc.constantFrom('', '\ufeff'),
        fc.integer({ min: 1, max: 200 }),
        (rows, [delimiter, mark], lineEnd, headed, start, most) => {
          // Rows of words alone look like headings; the first rows shall be seen as numbers.
          for (const row of rows) row[0] = Number.isFinite(row[0]) ? row[0] : 0.5;
          const heading = headed ? [rows[0].map((_, column) => `c${column}`).join(delimiter)] : [];
          const lines = rows.map((row) =>
            row.map((v) => (Object.is(v, -0) ? '-0' : String(v)).replace('.', mark)).join(delimiter),
          );
          const text = start + [...heading, ...lines, ''].join(lineEnd);
          const bytes = new TextEncoder().encode(text);
          const expected = rows[0].map((_, column) => rows.map((row) => row[column]));
          expect(wholeChannels(csvReader, bytes)).toEqual(expected);
          expect(readAll(csvReader, shortReads(bytes, most)).channels).toEqual(expected);
        },
      ),
      { seed, numRuns: 600 },
    );
  });
});

describe('spoilt recordings: an answer always, in bounded reads and memory', () => {
  interface Watched extends ByteSource {
    reads: number;
    bytes: number;
  }
  function watched(bytes: Uint8Array): Watched {
    const source = bytesSource(bytes);
    return {
      size: source.size,
      reads: 0,
      bytes: 0,
      read(offset, into) {
        this.reads++;
        const count = source.read(offset, into);
        this.bytes += count;
        return count;
      },
    };
  }

  /** Reads all and keeps the books: reads, blocks, frames, and the memory of what was given. */
  function survive(reader: RecordingReader, bytes: Uint8Array): string {
    const source = watched(bytes);
    const header = reader.header(source);
    if (isRefusal(header)) {
      expect(header.reason).toMatch(/^[^\n]{10,300}$/);
      return header.refused;
    }
    expect(header.channelNames.length).toBeLessThanOrEqual(1024);
    let blocks = 0;
    let frames = 0;
    const buffers = new Set<ArrayBufferLike>();
    const generator = reader.samples(source, header);
    for (;;) {
      const step = generator.next();
      if (step.done) {
        expect(source.reads).toBeLessThan(4200);
        expect(source.bytes).toBeLessThan(4 * bytes.length + 100_000);
        expect([...buffers].reduce((sum, buffer) => sum + buffer.byteLength, 0)).toBeLessThan(2 ** 21);
        if (isRefusal(step.value)) {
          expect(step.value.reason).toMatch(/^[^\n]{10,300}$/);
          return step.value.refused;
        }
        expect(step.value.frames).toBe(frames);
        return step.value.truncated === null ? 'whole' : 'truncated';
      }
      blocks++;
      frames += step.value.frames;
      if (blocks > 2000 || step.value.frames < 1)
        throw new Error(`block ${blocks} of ${step.value.frames} frames`);
      for (const channel of step.value.channels) buffers.add(channel.buffer);
    }
  }

  const random = seededRandom(seed);
  const below = (limit: number): number => Math.floor(random.uniform() * limit);
  const telling = [0, 1, 0x7f, 0x80, 0xff, 0x0a, 0x0d, 0x22, 0x2c, 0x3b, 0x2d, 0x2e, 0x65];

  /** One to five spoilings: bytes changed, ranges cut, doubled or zeroed, the end cut off, early bytes the likeliest. */
  function spoilt(original: Uint8Array): Uint8Array {
    let bytes = original.slice();
    for (let count = 1 + below(5); count > 0 && bytes.length > 1; count--) {
      const at = random.uniform() < 0.6 ? below(Math.min(80, bytes.length)) : below(bytes.length);
      const length = 1 + below(random.uniform() < 0.8 ? 8 : 200);
      const kind = below(6);
      if (kind === 0) bytes[at] = telling[below(telling.length)];
      else if (kind === 1) bytes[at] ^= 1 << below(8);
      else if (kind === 2) bytes.fill(below(2) * 255, at, at + length);
      else if (kind === 3)
        bytes = Uint8Array.from([...bytes.subarray(0, at), ...bytes.subarray(at + length)]);
      else if (kind === 4)
        bytes = Uint8Array.from([...bytes.subarray(0, at + length), ...bytes.subarray(at)]);
      else bytes = bytes.slice(0, random.uniform() < 0.5 ? at : bytes.length - length);
    }
    return bytes;
  }

  function counts(reader: RecordingReader, originals: readonly Uint8Array[]): Record<string, number> {
    const found: Record<string, number> = {};
    for (let run = 0; run < 5000; run++) {
      const answer = survive(reader, spoilt(originals[run % originals.length]));
      found[answer] = (found[answer] ?? 0) + 1;
    }
    return found;
  }

  test('5,000 WAV files', () => {
    const data = Uint8Array.from({ length: 600 }, () => below(256));
    const chunks = [{ id: 'LIST', payload: letters('INFOabc') }, bext('2026-03-01', '06:00:00')];
    const originals = (['RIFF', 'RIFX', 'RF64', 'BW64'] as const).flatMap((id) => [
      wavFile({ id, data, before: chunks, channels: 2 }),
      wavFile({ id, data, after: chunks, bits: 24, validBits: 20, channels: 2 }),
      wavFile({ id, data: data.subarray(0, 560), code: 3, bits: 32 }),
    ]);
    const found = counts(wavReader, originals);
    // All kinds of answers must come up, or the spoiling does not reach far enough.
    for (const kind of ['whole', 'truncated', 'damaged', 'unsupported', 'foreign'])
      expect(found[kind]).toBeGreaterThan(20);
  });

  test('5,000 CSV files', () => {
    const table = (write: (index: number) => string): string =>
      Array.from({ length: 40 }, (_, index) => write(index)).join('');
    const originals = [
      `Time (s),DE [m/s2]\n${table((i) => `${(i / 100).toFixed(3)},${Math.sin(i)}\n`)}`,
      `Zeit;A;B\r\ns;g;g\r\n${table((i) => `${i};${i},5;-${i},25\r\n`)}`,
      `# remark\n${table((i) => `${i}\t"${i}"\t\t1e${i}\n`)}`,
      `date/time,x\n${table((i) => `2026-03-01T06:00:${String(i).padStart(2, '0')}.5Z,${i}\n`)}`,
      `${table((i) => ` ${i}   ${-i}  nan\n`)}`,
      `\ufeffa\r${table((i) => `${i}.5\r`)}`,
    ].map((text) => new TextEncoder().encode(text));
    const found = counts(csvReader, originals);
    for (const kind of ['whole', 'truncated', 'damaged']) expect(found[kind]).toBeGreaterThan(100);
  });
});
