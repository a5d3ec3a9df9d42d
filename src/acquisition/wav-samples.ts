import type { WavFormat } from './wav-format.ts';

/**
 * Interleaved bytes to one array a channel. Integers become fractions of full scale, value / 2^(bits - 1) by the
 * container; 8-bit samples are unsigned with 128 as zero; floats stay as they are.
 *
 * `bytes` begins at offset 0 of its buffer, so that samples can be read as typed arrays; it is changed where its
 * byte order is not the machine's. One loop a sample kind keeps each loop on one array type.
 */
export type FrameDecoder = (bytes: Uint8Array, frames: number, channels: readonly Float64Array[]) => void;

const littleEndianMachine = new Uint8Array(Uint16Array.of(1).buffer)[0] === 1;

export function frameDecoder(format: WavFormat, bigEndian: boolean): FrameDecoder {
  const decode = decoderFor(format);
  const width = format.containerBytes;
  // 24 bit is read byte by byte, low byte first, on every machine.
  const swap = width === 3 ? bigEndian : width > 1 && bigEndian === littleEndianMachine;
  if (!swap) return decode;
  return (bytes, frames, channels) => {
    reverseEach(bytes.subarray(0, frames * format.frameBytes), width);
    decode(bytes, frames, channels);
  };
}

function decoderFor(format: WavFormat): FrameDecoder {
  if (format.encoding === 'float') return format.containerBytes === 4 ? float32 : float64;
  return [unsigned8, signed16, signed24, signed32][format.containerBytes - 1];
}

function unsigned8(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length;
  for (let channel = 0; channel < step; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel; frame < frames; frame++, at += step)
      out[frame] = (bytes[at] - 128) / 128;
  }
}

function signed16(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length;
  const values = new Int16Array(bytes.buffer, 0, frames * step);
  for (let channel = 0; channel < step; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel; frame < frames; frame++, at += step) out[frame] = values[at] / 32_768;
  }
}

function signed24(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length * 3;
  for (let channel = 0; channel < channels.length; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel * 3; frame < frames; frame++, at += step) {
      // Put into the upper 24 bits, so that the shift back carries the sign.
      const value = ((bytes[at] << 8) | (bytes[at + 1] << 16) | (bytes[at + 2] << 24)) >> 8;
      out[frame] = value / 8_388_608;
    }
  }
}

function signed32(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length;
  const values = new Int32Array(bytes.buffer, 0, frames * step);
  for (let channel = 0; channel < step; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel; frame < frames; frame++, at += step)
      out[frame] = values[at] / 2_147_483_648;
  }
}

function float32(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length;
  const values = new Float32Array(bytes.buffer, 0, frames * step);
  for (let channel = 0; channel < step; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel; frame < frames; frame++, at += step) out[frame] = values[at];
  }
}

function float64(bytes: Uint8Array, frames: number, channels: readonly Float64Array[]): void {
  const step = channels.length;
  const values = new Float64Array(bytes.buffer, 0, frames * step);
  for (let channel = 0; channel < step; channel++) {
    const out = channels[channel];
    for (let frame = 0, at = channel; frame < frames; frame++, at += step) out[frame] = values[at];
  }
}

function reverseEach(bytes: Uint8Array, width: number): void {
  for (let start = 0; start + width <= bytes.length; start += width)
    bytes.subarray(start, start + width).reverse();
}
