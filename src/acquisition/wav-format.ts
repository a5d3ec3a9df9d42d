import type { Refusal } from './recording.ts';

/** How samples lie in a WAV file: channels interleaved frame by frame, `frameBytes` = channels x container bytes. */
export interface WavFormat {
  readonly encoding: 'integer' | 'float';
  readonly channels: number;
  readonly sampleRateHz: number;
  /** Bytes of one sample, its unused bits among them: 1, 2, 3, 4 (integer) or 4, 8 (float). */
  readonly containerBytes: number;
  readonly frameBytes: number;
  readonly remarks: readonly string[];
}

export const mostChannels = 1024;
const highestRateHz = 1e8;

const formatPcm = 1;
const formatFloat = 3;
const formatExtensible = 0xfffe;
const formatNames: Readonly<Record<number, string>> = {
  0: 'unknown',
  2: 'ADPCM',
  6: 'A-law',
  7: 'mu-law',
  17: 'IMA ADPCM',
  80: 'MPEG',
  85: 'MPEG layer 3',
};

/** Last 8 bytes of the sub-format GUID xxxxxxxx-0000-0010-8000-00aa00389b71 (Microsoft WAVEFORMATEXTENSIBLE). */
const guidTail = [0x80, 0x00, 0x00, 0xaa, 0x00, 0x38, 0x9b, 0x71];

const recordAgain = 'have the logger write PCM or float samples';

/**
 * Reads the payload of a 'fmt ' chunk (16, 18 or 40 bytes; Microsoft/IBM Multimedia Programming Interface and Data
 * Specifications 1.0, 1991; WAVEFORMATEXTENSIBLE). `offset` is where the payload lies in the file, for the words of
 * a refusal.
 */
export function wavFormat(payload: Uint8Array, offset: number, bigEndian: boolean): WavFormat | Refusal {
  const where = `'fmt ' chunk at byte ${offset - 8}`;
  const damaged = (what: string): Refusal => ({
    refused: 'damaged',
    reason: `${where}: ${what}; the header is broken, record again`,
  });
  if (payload.length < 16) return damaged(`${payload.length} bytes where at least 16 are needed`);

  const view = new DataView(payload.buffer, payload.byteOffset, payload.byteLength);
  const little = !bigEndian;
  const channels = view.getUint16(2, little);
  const sampleRateHz = view.getUint32(4, little);
  const bytesPerSecond = view.getUint32(8, little);
  const frameBytes = view.getUint16(12, little);
  const bits = view.getUint16(14, little);

  const code = sampleCode(view, payload, little, where);
  if (typeof code !== 'number') return code;
  if (code !== formatPcm && code !== formatFloat) {
    const name = formatNames[code] === undefined ? '' : ` (${formatNames[code]})`;
    return { refused: 'unsupported', reason: `${where}: sample format ${code}${name}; ${recordAgain}` };
  }
  if (channels < 1 || channels > mostChannels)
    return damaged(`${channels} channels, 1 to ${mostChannels} can be`);
  if (sampleRateHz < 1 || sampleRateHz > highestRateHz) return damaged(`sample rate ${sampleRateHz} Hz`);

  const encoding = code === formatFloat ? 'float' : 'integer';
  const known = encoding === 'float' ? [32, 64] : [8, 16, 24, 32];
  if (!known.includes(bits)) {
    const reason = `${where}: ${bits} bits a sample, ${encoding} samples have ${known.join(', ')}; ${recordAgain}`;
    return { refused: 'unsupported', reason };
  }
  const containerBytes = bits / 8;
  if (frameBytes !== channels * containerBytes) {
    return damaged(
      `block align ${frameBytes} where ${channels} x ${bits} bit need ${channels * containerBytes}`,
    );
  }

  const remarks: string[] = [];
  if (bytesPerSecond !== sampleRateHz * frameBytes) {
    remarks.push(
      `bytes a second stated as ${bytesPerSecond}, ${sampleRateHz * frameBytes} by the other fields`,
    );
  }
  return { encoding, channels, sampleRateHz, containerBytes, frameBytes, remarks };
}

/** The format code: that of the sub-format where the chunk is of the extensible kind. */
function sampleCode(view: DataView, payload: Uint8Array, little: boolean, where: string): number | Refusal {
  const code = view.getUint16(0, little);
  if (code !== formatExtensible) return code;
  const damaged = (what: string): Refusal => ({
    refused: 'damaged',
    reason: `${where}: ${what}; the header is broken, record again`,
  });
  if (payload.length < 40) return damaged(`extensible format in ${payload.length} bytes, 40 are needed`);
  const extraBytes = view.getUint16(16, little);
  if (extraBytes < 22) return damaged(`extensible format with ${extraBytes} extra bytes, 22 are needed`);
  // Valid bits are left-justified in their container with zeros below, so scaling by the container is right for all.
  const validBits = view.getUint16(18, little);
  const bits = view.getUint16(14, little);
  if (validBits > bits) return damaged(`${validBits} valid bits in a container of ${bits}`);
  const standard =
    view.getUint16(28, little) === 0 &&
    view.getUint16(30, little) === 0x10 &&
    guidTail.every((byte, index) => payload[32 + index] === byte);
  if (!standard) {
    return {
      refused: 'unsupported',
      reason: `${where}: sub-format is not one of the standard GUIDs; ${recordAgain}`,
    };
  }
  return view.getUint32(24, little);
}
