/** Writes WAV files for tests, right or deliberately wrong. */
export interface WavParts {
  readonly id?: 'RIFF' | 'RIFX' | 'RF64' | 'BW64';
  readonly code?: number;
  readonly channels?: number;
  readonly rateHz?: number;
  readonly bits?: number;
  readonly frameBytes?: number;
  /** Writes the 40-byte form with these valid bits. */
  readonly validBits?: number;
  readonly before?: readonly Chunk[];
  readonly after?: readonly Chunk[];
  readonly data?: Uint8Array;
  /** Sizes to write in place of the true ones. */
  readonly dataSize?: number;
  readonly riffSize?: number;
  readonly wideDataSize?: bigint;
  /** False leaves out every pad byte. */
  readonly pad?: boolean;
}

export interface Chunk {
  readonly id: string;
  readonly payload: Uint8Array;
}

export function hex(text: string): Uint8Array {
  return Uint8Array.from(text.trim().split(/\s+/), (byte) => Number.parseInt(byte, 16));
}

export function joined(...parts: readonly Uint8Array[]): Uint8Array {
  const all = new Uint8Array(parts.reduce((sum, part) => sum + part.length, 0));
  let at = 0;
  for (const part of parts) {
    all.set(part, at);
    at += part.length;
  }
  return all;
}

export function letters(text: string): Uint8Array {
  return Uint8Array.from(text, (letter) => letter.charCodeAt(0));
}

export function fields(
  little: boolean,
  ...values: readonly (readonly [16 | 32 | 64, number | bigint])[]
): Uint8Array {
  const parts = values.map(([bits, value]) => {
    const view = new DataView(new ArrayBuffer(bits / 8));
    if (bits === 16) view.setUint16(0, Number(value), little);
    else if (bits === 32) view.setUint32(0, Number(value), little);
    else view.setBigUint64(0, BigInt(value), little);
    return new Uint8Array(view.buffer);
  });
  return joined(...parts);
}

export function chunk(
  little: boolean,
  id: string,
  payload: Uint8Array,
  size = payload.length,
  pad = true,
): Uint8Array {
  const padding = new Uint8Array(pad && payload.length % 2 === 1 ? 1 : 0);
  return joined(letters(id.padEnd(4)), fields(little, [32, size]), payload, padding);
}

const pcmGuid = hex('01 00 00 00 00 00 10 00 80 00 00 aa 00 38 9b 71');
const floatGuid = hex('03 00 00 00 00 00 10 00 80 00 00 aa 00 38 9b 71');

export function fmtPayload(parts: WavParts): Uint8Array {
  const { code = 1, channels = 1, rateHz = 25_600, bits = 16 } = parts;
  const frameBytes = parts.frameBytes ?? Math.trunc((channels * bits) / 8);
  const little = parts.id !== 'RIFX';
  const extensible = parts.validBits !== undefined;
  const basic = fields(
    little,
    [16, extensible ? 0xfffe : code],
    [16, channels],
    [32, rateHz],
    [32, (rateHz * frameBytes) % 2 ** 32],
    [16, frameBytes],
    [16, bits],
  );
  if (!extensible) return basic;
  const extra = fields(little, [16, 22], [16, parts.validBits ?? 0], [32, 0]);
  return joined(basic, extra, code === 3 ? floatGuid : pcmGuid);
}

export function wavFile(parts: WavParts): Uint8Array {
  const { id = 'RIFF', data = new Uint8Array(0), before = [], after = [], pad = true } = parts;
  const little = id !== 'RIFX';
  const wide = id === 'RF64' || id === 'BW64';
  const each = (chunks: readonly Chunk[]): Uint8Array[] =>
    chunks.map(({ id, payload }) => chunk(little, id, payload, payload.length, pad));
  const body = (ds64: Uint8Array): Uint8Array =>
    joined(
      letters('WAVE'),
      ds64,
      ...each(before),
      chunk(little, 'fmt ', fmtPayload(parts)),
      chunk(little, 'data', data, parts.dataSize ?? (wide ? 0xffffffff : data.length), pad),
      ...each(after),
    );
  const ds64Of = (riffBytes: number): Uint8Array => {
    const dataBytes = parts.wideDataSize ?? BigInt(data.length);
    return chunk(true, 'ds64', fields(true, [64, riffBytes], [64, dataBytes], [64, 0], [32, 0]));
  };
  const riffBytes = body(wide ? ds64Of(0) : new Uint8Array(0)).length;
  const size = parts.riffSize ?? (wide ? 0xffffffff : riffBytes);
  return joined(letters(id), fields(little, [32, size]), body(wide ? ds64Of(riffBytes) : new Uint8Array(0)));
}

/** A 'bext' chunk with origination date and time at their places (EBU Tech 3285). */
export function bext(date: string, time: string): Chunk {
  const payload = new Uint8Array(602);
  payload.set(letters(date), 320);
  payload.set(letters(time), 330);
  return { id: 'bext', payload };
}
