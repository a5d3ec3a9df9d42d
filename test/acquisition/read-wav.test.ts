import { describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { wavReader } from '../../src/acquisition/read-wav.ts';
import { isRefusal, type RecordingHeader } from '../../src/acquisition/recording.ts';
import { readAll, refusalOf, wholeChannels } from './read-all.ts';
import {
  bext,
  chunk,
  fields,
  fmtPayload,
  hex,
  joined,
  letters,
  type WavParts,
  wavFile,
} from './wav-writer.ts';

/** Odd sizes, unknown ids, orders, sizes left open: what recorders really write, and what must be refused. */

function headerOf(bytes: Uint8Array): RecordingHeader {
  const header = wavReader.header(bytesSource(bytes));
  if (isRefusal(header)) throw new Error(header.reason);
  return header;
}

const sixteen = (...values: number[]): Uint8Array => new Uint8Array(Int16Array.from(values).buffer);

describe('each sample format, with its extremes', () => {
  // Microsoft/IBM, Multimedia Programming Interface and Data Specifications 1.0 (1991): 44-byte header, 2 channels,
  // 25 600 Hz, 24 bit, 2 frames.
  const published =
    hex(`52 49 46 46 30 00 00 00 57 41 56 45 66 6d 74 20 10 00 00 00 01 00 02 00 00 64 00 00 00 58 02 00
    06 00 18 00 64 61 74 61 0c 00 00 00`);

  test('24 bit, with the published header: +1, -1, greatest, least', () => {
    const file = joined(published, hex('01 00 00 ff ff ff ff ff 7f 00 00 80'));
    expect(wholeChannels(wavReader, file)).toEqual([
      [1 / 8_388_608, 8_388_607 / 8_388_608],
      [-1 / 8_388_608, -1],
    ]);
    const header = headerOf(file);
    expect(header).toMatchObject({
      sampleRateHz: 25_600,
      channelNames: ['1', '2'],
      framesClaimed: 2,
      complete: true,
    });
    expect(header).toMatchObject({ format: 'WAV', samples: 'integer', start: null, remarks: [] });
    expect(header.channelUnits).toEqual([null, null]);
  });

  test('8 bit is unsigned with 128 as zero', () => {
    const file = wavFile({ bits: 8, data: Uint8Array.of(0, 127, 128, 129, 255) });
    expect(wholeChannels(wavReader, file)).toEqual([[-1, -1 / 128, 0, 1 / 128, 127 / 128]]);
  });

  test('16 bit', () => {
    const file = wavFile({ channels: 3, data: sixteen(0, 1, -1, 32_767, -32_768, 16_384) });
    expect(wholeChannels(wavReader, file)).toEqual([
      [0, 32_767 / 32_768],
      [1 / 32_768, -1],
      [-1 / 32_768, 0.5],
    ]);
  });

  test('32 bit', () => {
    const data = new Uint8Array(Int32Array.of(1, -1, 2_147_483_647, -2_147_483_648).buffer);
    const expected = [2 ** -31, -(2 ** -31), 2_147_483_647 / 2 ** 31, -1];
    expect(wholeChannels(wavReader, wavFile({ bits: 32, data }))).toEqual([expected]);
  });

  test('float 32 and 64 stay as they are, beyond 1, not a number and infinite among them', () => {
    const values = [
      0,
      -0,
      1,
      -1,
      9.81,
      -1e30,
      Number.NaN,
      Number.POSITIVE_INFINITY,
      Number.NEGATIVE_INFINITY,
    ];
    const single = wavFile({ code: 3, bits: 32, data: new Uint8Array(Float32Array.from(values).buffer) });
    expect(wholeChannels(wavReader, single)).toEqual([values.map(Math.fround)]);
    const double = wavFile({ code: 3, bits: 64, data: new Uint8Array(Float64Array.from(values).buffer) });
    expect(wholeChannels(wavReader, double)).toEqual([values]);
    expect(headerOf(double).samples).toBe('number');
  });

  test('extensible: valid bits lie left in their container and are scaled by the container', () => {
    // 20 valid bits in 24: full scale +0x7ffff << 4.
    const file = wavFile({ bits: 24, validBits: 20, data: hex('f0 ff 7f 00 00 80 10 00 00') });
    expect(wholeChannels(wavReader, file)).toEqual([[0x7ffff0 / 0x800000, -1, 16 / 0x800000]]);
    const twelve = wavFile({ bits: 16, validBits: 12, data: sixteen(0x7ff0, -0x8000) });
    expect(wholeChannels(wavReader, twelve)).toEqual([[0x7ff / 0x800, -1]]);
    const float = wavFile({
      code: 3,
      bits: 32,
      validBits: 32,
      data: new Uint8Array(Float32Array.of(2.5).buffer),
    });
    expect(wholeChannels(wavReader, float)).toEqual([[2.5]]);
  });

  test('RIFX: the same layout, high byte first', () => {
    const sixteenBit = wavFile({ id: 'RIFX', channels: 2, data: hex('00 01 ff ff 7f ff 80 00') });
    expect(wholeChannels(wavReader, sixteenBit)).toEqual([
      [1 / 32_768, 32_767 / 32_768],
      [-1 / 32_768, -1],
    ]);
    const twentyFour = wavFile({ id: 'RIFX', bits: 24, data: hex('00 00 01 7f ff ff') });
    expect(wholeChannels(wavReader, twentyFour)).toEqual([[2 ** -23, 8_388_607 / 8_388_608]]);
    const float = wavFile({
      id: 'RIFX',
      code: 3,
      bits: 64,
      validBits: 64,
      data: hex('3f f8 00 00 00 00 00 00'),
    });
    expect(float.length).toBeGreaterThan(60);
    const guid = hex('00 00 00 03 00 00 00 10 80 00 00 aa 00 38 9b 71');
    float.set(guid, 20 + 24);
    expect(wholeChannels(wavReader, float)).toEqual([[1.5]]);
  });
});

describe('RF64 and BW64', () => {
  test('the published first 48 bytes promise 5 000 000 000 bytes of samples', () => {
    // EBU Tech 3306 v1.1 (2009): ds64 with riffSize, dataSize, sampleCount.
    const top =
      hex(`52 46 36 34 ff ff ff ff 57 41 56 45 64 73 36 34 1c 00 00 00 48 f2 05 2a 01 00 00 00 00 f2 05 2a
      01 00 00 00 80 7c 81 4a 00 00 00 00 00 00 00 00`);
    const rest = joined(
      chunk(true, 'fmt ', fmtPayload({ channels: 2 })),
      chunk(true, 'data', sixteen(1, 2, 3, 4), 0xffffffff),
    );
    const { header, channels, end } = readAll(wavReader, joined(top, rest));
    expect(header).toMatchObject({ framesClaimed: 1_250_000_000, complete: false });
    expect(channels[1]).toEqual([2 / 32_768, 4 / 32_768]);
    expect(end).toMatchObject({
      frames: 2,
      truncated: expect.stringContaining('2 of 1250000000 promised frames'),
    });
  });

  test.each(['RF64', 'BW64'] as const)(
    '%s takes the data size from ds64, and chunks behind the samples',
    (id) => {
      const after = [bext('2026-03-01', '12:30:15')];
      const file = wavFile({ id, data: sixteen(1, 2, 3), after });
      expect(wholeChannels(wavReader, file)).toEqual([[1, 2, 3].map((v) => v / 32_768)]);
      expect(headerOf(file).start).toEqual({
        ms: Date.UTC(2026, 2, 1, 12, 30, 15),
        zoned: false,
        origin: 'header',
      });
    },
  );

  test('a data size in the data chunk itself counts as it stands', () => {
    const file = wavFile({ id: 'RF64', data: sixteen(1, 2, 3), dataSize: 6, wideDataSize: 999n });
    expect(headerOf(file).framesClaimed).toBe(3);
  });

  test('a size beyond what a file can have is refused; one left open means the file to its end', () => {
    const absurd = wavFile({ id: 'RF64', data: sixteen(1), wideDataSize: 2n ** 60n });
    expect(refusalOf(wavReader, absurd)?.reason).toMatch(
      /'ds64' chunk at byte 12: data size 1152921504606846976/,
    );
    const open = wavFile({ id: 'RF64', data: sixteen(1, 2), wideDataSize: 2n ** 64n - 1n });
    expect(wholeChannels(wavReader, open)).toEqual([[1, 2].map((v) => v / 32_768)]);
    expect(headerOf(open)).toMatchObject({ framesClaimed: null, complete: true });
  });
});

describe('chunks', () => {
  const data = sixteen(1, -2, 3);
  const samples = [[1, -2, 3].map((value) => value / 32_768)];
  const odd = { id: 'odd!', payload: letters('abc') };

  test('unknown, odd and empty ones are jumped over, ahead of and behind the samples', () => {
    const before = [
      odd,
      { id: 'LIST', payload: letters('INFOx') },
      { id: 'none', payload: new Uint8Array(0) },
    ];
    const file = wavFile({ data, before, after: [odd, bext('2026-03-01', '06:07:08')] });
    expect(wholeChannels(wavReader, file)).toEqual(samples);
    const header = headerOf(file);
    expect(header.remarks).toEqual(["3 unknown chunks skipped ('odd!', 'none')"]);
    expect(header.start?.ms).toBe(Date.UTC(2026, 2, 1, 6, 7, 8));
  });

  test('a forgotten pad byte is found out by the next name', () => {
    const file = wavFile({ data, before: [odd, { id: 'LIST', payload: letters('INFOx') }], pad: false });
    expect(wholeChannels(wavReader, file)).toEqual(samples);
    expect(headerOf(file).remarks.filter((remark) => remark.startsWith('no pad byte'))).toHaveLength(2);
  });

  test('a forgotten pad byte is found out even where the size behind it reads as letters', () => {
    // 'LIST' with a size whose low byte is a letter: 'IST' + that byte could be a name as well.
    const before = [odd, { id: 'LIST', payload: new Uint8Array(0x42) }];
    expect(wholeChannels(wavReader, wavFile({ data, before, pad: false }))).toEqual(samples);
  });

  test('a pad byte that is not zero is still a pad byte', () => {
    const file = wavFile({ data, before: [odd] });
    file[12 + 8 + 3] = 0x41;
    expect(wholeChannels(wavReader, file)).toEqual(samples);
  });

  test('rubbish and a second data chunk behind the samples are left out with a remark', () => {
    const rubbish = joined(wavFile({ data }), Uint8Array.of(0, 1, 2, 3, 4, 5, 6, 7, 8));
    expect(wholeChannels(wavReader, rubbish)).toEqual(samples);
    expect(headerOf(rubbish).remarks.join()).toMatch(/9 bytes behind the last chunk left out/);
    const twice = wavFile({ data, after: [{ id: 'data', payload: sixteen(9) }] });
    expect(wholeChannels(wavReader, twice)).toEqual(samples);
    expect(headerOf(twice).remarks.join()).toMatch(/a second 'data' chunk at byte 50 left out/);
  });

  test('more than 1000 chunks ahead of the samples are refused', () => {
    const before = Array.from({ length: 1001 }, () => ({ id: 'JUNK', payload: new Uint8Array(0) }));
    expect(refusalOf(wavReader, wavFile({ data, before }))?.reason).toMatch(/more than 1000 chunks/);
  });
});

describe('start of a Broadcast Wave', () => {
  const start = (date: string, time: string): RecordingHeader =>
    headerOf(wavFile({ data: sixteen(1), before: [bext(date, time)] }));

  test('date and time, with any of the separators of EBU Tech 3285', () => {
    const expected = { ms: Date.UTC(2026, 1, 28, 23, 59, 58), zoned: false, origin: 'header' };
    expect(start('2026-02-28', '23:59:58').start).toEqual(expected);
    expect(start('2026:02:28', '23-59-58').start).toEqual(expected);
    expect(start('2026_02_28', '23.59.58').start).toEqual(expected);
  });

  test('left blank: none; no possible date: none, with a remark', () => {
    expect(start('', '').start).toBeNull();
    expect(start('          ', '        ').remarks).toEqual([]);
    for (const [date, time] of [
      ['2026-02-30', '00:00:00'],
      ['2026-13-01', '00:00:00'],
      ['2026-01-01', '24:00:00'],
      ['2026-01-01', '12:60:00'],
      ['2026-01-01', '12:00:60'],
      ['0000-00-00', '00:00:00'],
      ['yesterday!', '00:00:00'],
    ]) {
      expect(start(date, time).start).toBeNull();
      expect(start(date, time).remarks.join()).toMatch(
        /^'bext' chunk at byte 12: .*start not taken from it$/,
      );
    }
  });
});

describe('length', () => {
  test.each([0, 0xffffffff])('a data size of %d means the file to its end, with a remark', (dataSize) => {
    const file = wavFile({ data: sixteen(1, 2, 3), dataSize, riffSize: dataSize });
    const { header, channels, end } = readAll(wavReader, file);
    expect(header).toMatchObject({ framesClaimed: null, complete: true });
    expect(header.remarks.join()).toMatch(/leaves the length open/);
    expect(channels[0]).toHaveLength(3);
    expect(end).toEqual({ frames: 3, truncated: null, timeStepDeviation: null, measuredRateHz: null });
  });

  test('a finished file with no samples is not complete: a recorder may only have begun', () => {
    const { header, end } = readAll(
      wavReader,
      wavFile({ after: [{ id: 'LIST', payload: letters('INFO') }] }),
    );
    expect(header).toMatchObject({ framesClaimed: 0, complete: false });
    expect(end).toMatchObject({ frames: 0 });
  });

  test('a last frame cut short is dropped and told', () => {
    const file = wavFile({ channels: 2, data: joined(sixteen(1, 2, 3), Uint8Array.of(9)) });
    const { channels, end } = readAll(wavReader, file);
    expect(channels).toEqual([[1 / 32_768], [2 / 32_768]]);
    expect(end).toMatchObject({
      frames: 1,
      truncated: 'the last frame at byte 48 has 3 of 4 bytes, dropped',
    });
  });

  test('samples still missing: not complete, and what is there can be read', () => {
    const whole = wavFile({ data: sixteen(...Array.from({ length: 1000 }, (_, index) => index)) });
    const { header, channels, end } = readAll(wavReader, whole.subarray(0, 44 + 501));
    expect(header).toMatchObject({ framesClaimed: 1000, complete: false });
    expect(header.remarks.join()).toMatch(/promises 2000 bytes of samples, 501 are there/);
    expect(channels[0]).toHaveLength(250);
    expect(end).toMatchObject({
      frames: 250,
      truncated: expect.stringContaining('250 of 1000 promised frames'),
    });
  });

  test('a file cut anywhere in its header is not complete, and its samples are refused as damaged', () => {
    const file = wavFile({ data: sixteen(1, 2), before: [bext('2026-03-01', '06:00:00')] });
    for (let length = 0; length < file.length - 4; length++) {
      const cut = file.subarray(0, length);
      const header = headerOf(cut);
      expect(header.complete).toBe(false);
      expect(header.remarks).not.toEqual([]);
      expect(refusalOf(wavReader, cut)).toMatchObject({ refused: 'damaged' });
    }
    expect(headerOf(file).complete).toBe(true);
  });

  test('reserved space: zeros ahead of the samples or at their end are waited for', () => {
    const data = new Uint8Array(10_000).fill(7);
    const file = wavFile({ data });
    expect(headerOf(file).complete).toBe(true);
    const zeroTail = file.slice();
    zeroTail.fill(0, file.length - 5000);
    expect(headerOf(zeroTail)).toMatchObject({ complete: false, framesClaimed: 5000 });
    expect(readAll(wavReader, zeroTail).end).toMatchObject({ frames: 5000, truncated: null });
    for (const from of [0, 12, 20]) {
      const reserved = file.slice();
      reserved.fill(0, from);
      expect(headerOf(reserved).complete).toBe(false);
      expect(refusalOf(wavReader, reserved)).toMatchObject({ refused: 'damaged' });
    }
  });

  test('a RIFF size that is wrong is only remarked', () => {
    const file = wavFile({ data: sixteen(1, 2), riffSize: 4711 });
    expect(wholeChannels(wavReader, file)).toHaveLength(1);
    expect(headerOf(file)).toMatchObject({ complete: true });
    expect(headerOf(file).remarks.join()).toMatch(/RIFF header says 4719 bytes, the file has 48/);
  });
});

describe('absurd headers are refused with what, where and what to do', () => {
  const cases: [string, WavParts, string, RegExp][] = [
    ['no channels', { channels: 0 }, 'damaged', /^'fmt ' chunk at byte 12: 0 channels, .*; .*record again$/],
    ['too many channels', { channels: 1025 }, 'damaged', /1025 channels, 1 to 1024 can be/],
    ['rate 0', { rateHz: 0 }, 'damaged', /sample rate 0 Hz/],
    ['rate beyond 100 MHz', { rateHz: 100_000_001 }, 'damaged', /sample rate 100000001 Hz/],
    ['block align', { channels: 2, frameBytes: 3 }, 'damaged', /block align 3 where 2 x 16 bit need 4/],
    [
      '12 bits',
      { bits: 12, frameBytes: 2 },
      'unsupported',
      /12 bits a sample, integer samples have 8, 16, 24, 32/,
    ],
    ['16-bit float', { code: 3, bits: 16 }, 'unsupported', /16 bits a sample, float samples have 32, 64/],
    ['A-law', { code: 6, bits: 8 }, 'unsupported', /sample format 6 \(A-law\); have the logger write PCM/],
    ['mu-law', { code: 7, bits: 8 }, 'unsupported', /sample format 7 \(mu-law\)/],
    ['an unknown code', { code: 4711 }, 'unsupported', /sample format 4711; /],
    ['more valid bits than bits', { validBits: 17 }, 'damaged', /17 valid bits in a container of 16/],
  ];
  test.each(cases)('%s', (_, parts, refused, words) => {
    const refusal = refusalOf(wavReader, wavFile({ ...parts, data: sixteen(1, 2) }));
    expect(refusal?.refused).toBe(refused);
    expect(refusal?.reason).toMatch(words);
    expect(refusal?.reason).not.toMatch(/\n/);
  });

  test('an extensible format cut short, with too small an extra size, or with a foreign GUID', () => {
    const extensible = fmtPayload({ validBits: 16 });
    const file = (payload: Uint8Array): Uint8Array =>
      joined(letters('RIFF'), fields(true, [32, 0]), letters('WAVE'), chunk(true, 'fmt ', payload));
    expect(refusalOf(wavReader, file(extensible.subarray(0, 26)))?.reason).toMatch(
      /extensible format in 26 bytes/,
    );
    const small = extensible.slice();
    small[16] = 20;
    expect(refusalOf(wavReader, file(small))?.reason).toMatch(/with 20 extra bytes, 22 are needed/);
    const foreign = extensible.slice();
    foreign[39] = 0x72;
    expect(refusalOf(wavReader, file(foreign))).toMatchObject({ refused: 'unsupported' });
    expect(refusalOf(wavReader, file(extensible.subarray(0, 14)))?.reason).toMatch(
      /14 bytes where at least 16/,
    );
  });

  test('samples ahead of the format, an unreadable chunk name, another kind of RIFF', () => {
    const top = joined(letters('RIFF'), fields(true, [32, 100]), letters('WAVE'));
    const early = joined(top, chunk(true, 'data', sixteen(1)));
    expect(refusalOf(wavReader, early)?.reason).toMatch(/'data' chunk at byte 12 ahead of any 'fmt ' chunk/);
    const unreadable = joined(top, hex('01 02 03 04 05 06 07 08'));
    expect(refusalOf(wavReader, unreadable)?.reason).toMatch(/^byte 12: a chunk's name expected; /);
    const film = joined(letters('RIFF'), fields(true, [32, 100]), letters('AVI LIST'), new Uint8Array(40));
    expect(refusalOf(wavReader, film)).toMatchObject({ refused: 'foreign' });
  });
});
