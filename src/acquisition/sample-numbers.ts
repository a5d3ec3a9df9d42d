/** How one sample is stored: IEEE 754, two's complement, or unsigned with the middle of its range as zero. */
export interface SampleNumber {
  readonly kind: 'float' | 'signed' | 'unsigned';
  readonly bytes: 1 | 2 | 4 | 8;
  readonly littleEndian: boolean;
}

/** Whether samples of that kind are fractions of full scale or stand as they are. */
export function samplesOf({ kind }: SampleNumber): 'integer' | 'number' {
  return kind === 'float' ? 'number' : 'integer';
}

const littleEndianMachine = new Uint8Array(Uint16Array.of(1).buffer)[0] === 1;

/**
 * Turns the byte order of `bytes` into the machine's, in place, so that they can be read as typed arrays. Once a
 * block, whatever number of channels is then picked out of it.
 */
export function toMachineOrder(bytes: Uint8Array, { bytes: width, littleEndian }: SampleNumber): void {
  if (width === 1 || littleEndian === littleEndianMachine) return;
  for (let start = 0; start + width <= bytes.length; start += width)
    bytes.subarray(start, start + width).reverse();
}

/**
 * Every `step`-th number from number `first` on, `count` of them, into `out` from its begin. Integers become fractions
 * of full scale, value / 2^(bits - 1), unsigned ones after their middle was taken off. `bytes` are in the machine's
 * order and begin at a multiple of eight in their buffer.
 */
export function pickSamples(
  bytes: Uint8Array,
  number: SampleNumber,
  { first, step, count }: { readonly first: number; readonly step: number; readonly count: number },
  out: Float64Array,
): void {
  const values = numbersIn(bytes, number);
  if (values instanceof BigInt64Array || values instanceof BigUint64Array) {
    const middle = number.kind === 'unsigned' ? 2n ** 63n : 0n;
    for (let n = 0, at = first; n < count; n++, at += step) out[n] = Number(values[at] - middle) / 2 ** 63;
    return;
  }
  if (number.kind === 'float') {
    for (let n = 0, at = first; n < count; n++, at += step) out[n] = values[at];
    return;
  }
  const full = 2 ** (8 * number.bytes - 1);
  const middle = number.kind === 'unsigned' ? full : 0;
  for (let n = 0, at = first; n < count; n++, at += step) out[n] = (values[at] - middle) / full;
}

function numbersIn(bytes: Uint8Array, { kind, bytes: width }: SampleNumber) {
  const { buffer, byteOffset } = bytes;
  const length = Math.floor(bytes.length / width);
  if (kind === 'float')
    return width === 4
      ? new Float32Array(buffer, byteOffset, length)
      : new Float64Array(buffer, byteOffset, length);
  if (kind === 'signed') {
    if (width === 1) return new Int8Array(buffer, byteOffset, length);
    if (width === 2) return new Int16Array(buffer, byteOffset, length);
    if (width === 4) return new Int32Array(buffer, byteOffset, length);
    return new BigInt64Array(buffer, byteOffset, length);
  }
  if (width === 1) return new Uint8Array(buffer, byteOffset, length);
  if (width === 2) return new Uint16Array(buffer, byteOffset, length);
  if (width === 4) return new Uint32Array(buffer, byteOffset, length);
  return new BigUint64Array(buffer, byteOffset, length);
}
