import { readdirSync, readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { bytesSource, readHead } from '../../src/acquisition/byte-source.ts';
import { csvReader } from '../../src/acquisition/read-csv.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { readerFor, readers } from '../../src/acquisition/readers.ts';
import { isRefusal } from '../../src/acquisition/recording.ts';
import type { SampleLayout } from '../../src/config/sample-layout.ts';
import { readAll, refusalOf } from './read-all.ts';
import { letters, wavFile } from './wav-writer.ts';

const folder = new URL('../files/recordings/', import.meta.url);
const file = (name: string): Uint8Array => new Uint8Array(readFileSync(new URL(name, folder)));

/** Lines `name | what is expected`, and behind a further | what the site file says; lines with # head a group. */
function list(name: string): [string, string, string?][] {
  return new TextDecoder()
    .decode(file(name))
    .split('\n')
    .filter((line) => line !== '' && !line.startsWith('#'))
    .map((line) => line.split(' | ').map((part) => part.trim()) as [string, string, string?]);
}

/** 'channels_in rows, dataset /fan' */
function layoutOf(said = ''): SampleLayout {
  const words = Object.fromEntries(said.split(', ').map((one) => one.split(' ')));
  const {
    dataset = null,
    sample_rate_attribute: sampleRateAttribute = null,
    channels_in: channelsIn = null,
  } = words;
  return { dataset, sampleRateAttribute, channelsIn };
}

describe('recordings that are read', () => {
  test.each(list('valid.txt'))('%s: %s', async (name, expected, said) => {
    const bytes = file(name);
    const reader = readerFor(readHead(bytesSource(bytes)), name);
    if (isRefusal(reader)) throw new Error(reader.reason);
    await reader.prepare?.();
    const { header, channels, end } = readAll(reader, bytes, layoutOf(said));
    if (isRefusal(end)) throw new Error(end.reason);
    const rate = header.sampleRateHz === null ? 'no rate' : `${Number(header.sampleRateHz.toFixed(3))} Hz`;
    const sum = channels.map((values) => Number(values.reduce((a, b) => a + b, 0).toPrecision(6)));
    const start = header.start === null ? [] : [`${new Date(header.start.ms).toISOString()}`];
    const cut = end.truncated === null ? [] : ['cut short'];
    if (!header.complete) cut.push('not complete');
    const words = [
      header.format,
      rate,
      `${end.frames} frames`,
      header.channelNames.join(' + '),
      `sums ${sum.join(' ')}`,
    ];
    expect([...words, ...start, ...cut].join(', ')).toBe(expected);
  });
});

describe('recordings that are refused', () => {
  test.each(list('invalid.txt'))('%s: %s', async (name, expected, said) => {
    const bytes = file(name);
    const reader = readerFor(readHead(bytesSource(bytes)), name);
    if (!isRefusal(reader)) await reader.prepare?.();
    const refusal = isRefusal(reader) ? reader : refusalOf(reader, bytes, layoutOf(said));
    expect(`${refusal?.refused}: ${refusal?.reason}`).toBe(expected);
  });
});

test('every sample file is in one of the two lists', () => {
  const listed = [...list('valid.txt'), ...list('invalid.txt')].map(([name]) => name);
  const present = readdirSync(folder).filter((name) => name !== 'valid.txt' && name !== 'invalid.txt');
  expect(present.sort()).toEqual(listed.sort());
});

describe('which reader takes a file', () => {
  const name = (bytes: Uint8Array, fileName: string): string => {
    const reader = readerFor(bytes, fileName);
    return isRefusal(reader) ? reader.refused : reader.format;
  };

  test('contents decide, not the name', () => {
    const wav = wavFile({ data: new Uint8Array(8) });
    for (const fileName of ['a.wav', 'a.dat', 'a', 'a.csv']) expect(name(wav, fileName)).toBe('WAV');
    const csv = letters('t;a\n0,0;1\n0,1;2\n0,2;3\n');
    for (const fileName of ['a.csv', 'a.txt', 'a.TSV', 'a', 'a.wav']) expect(name(csv, fileName)).toBe('CSV');
  });

  test('a file that is only just being written is known by its name', () => {
    for (const bytes of [new Uint8Array(0), new Uint8Array(4096), letters('RI')]) {
      expect(name(bytes, 'a.wav')).toBe('WAV');
    }
    for (const bytes of [new Uint8Array(0), new Uint8Array(4096), letters('Time;acc')]) {
      expect(name(bytes, 'a.csv')).toBe('CSV');
    }
    expect(name(letters('RIFF'), 'a.part')).toBe('WAV');
  });

  test('damaged is another answer than foreign', () => {
    const broken = wavFile({ channels: 0, data: new Uint8Array(8) });
    const reader = readerFor(broken, 'a.wav');
    expect(reader).toBe(wavReader);
    expect(wavReader.header(bytesSource(broken))).toMatchObject({ refused: 'damaged' });
    const prose = letters('Not a single number, in no line.\n'.repeat(3000));
    expect(readerFor(prose, 'a.csv')).toBe(csvReader);
    expect(csvReader.header(bytesSource(prose))).toMatchObject({ refused: 'damaged' });
  });

  test('no reader knows: foreign, with what is expected', () => {
    const picture = Uint8Array.of(0x89, 0x50, 0x4e, 0x47, 0x0d, 0x0a, 0x1a, 0x0a, 0, 0, 0, 13);
    const film = letters('RIFF\0\0\0\0AVI LIST');
    const prose = letters('Please read me first.\n');
    for (const [bytes, fileName] of [
      [picture, 'a.png'],
      [picture, 'a.csv'],
      [film, 'a.wav'],
      [prose, 'read.txt'],
    ] as const) {
      expect(readerFor(bytes, fileName)).toEqual({
        refused: 'foreign',
        reason: 'no reader knows this kind of file; WAV, CSV, UFF 58, NPY or HDF5 expected',
      });
    }
    expect(readerFor(new Uint8Array(0), 'a.dat')).toMatchObject({
      reason: expect.stringContaining('is empty'),
    });
  });

  test('recognising never throws, whatever the bytes and the name', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 300 }), fc.string(), (bytes, fileName) => {
        for (const reader of readers) expect(typeof reader.recognise(bytes, fileName)).toBe('boolean');
      }),
      { seed: 20261201, numRuns: 2000 },
    );
  });
});
