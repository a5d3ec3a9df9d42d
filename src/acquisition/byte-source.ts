import type { ByteSource } from './recording.ts';

/** Bytes that lie in memory already. */
export function bytesSource(bytes: Uint8Array): ByteSource {
  return {
    size: bytes.length,
    read(offset, into) {
      if (offset < 0 || offset >= bytes.length) return 0;
      const found = bytes.subarray(offset, offset + into.length);
      into.set(found);
      return found.length;
    },
  };
}

/**
 * Fills `into` from `offset` on, over as many short reads as the source needs; fewer bytes only at the end.
 * Stays inside `source.size`, so that a file that grows meanwhile is seen as it was when it was opened.
 */
export function readFully(source: ByteSource, offset: number, into: Uint8Array): number {
  const wanted = Math.min(into.length, Math.max(0, source.size - offset));
  let filled = 0;
  while (filled < wanted) {
    const count = source.read(offset + filled, into.subarray(filled, wanted));
    if (count <= 0) break;
    filled += count;
  }
  return filled;
}

/** The first bytes of a source: all that a reader may look at to recognise its format. */
export function readHead(source: ByteSource, bytes = headBytes): Uint8Array {
  const head = new Uint8Array(Math.min(bytes, source.size));
  return head.subarray(0, readFully(source, 0, head));
}

export const headBytes = 65_536;

export interface HashingSource extends ByteSource {
  /** Gives what was not read yet; returns how many bytes were given in all. */
  finish(): number;
}

/**
 * A source that hands every byte of the file to `update` exactly once and in order, however it is read, so that a
 * hash is ready when decoding is. A read that begins beyond what was given so far first gives the gap, through a
 * buffer of fixed size. `update` must use the bytes before it returns: their buffer is used again.
 */
export function hashingSource(source: ByteSource, update: (bytes: Uint8Array) => void): HashingSource {
  let given = 0;
  let gapBuffer: Uint8Array | null = null;

  const giveUpTo = (end: number): void => {
    while (given < end) {
      gapBuffer ??= new Uint8Array(headBytes);
      const count = readFully(source, given, gapBuffer.subarray(0, Math.min(gapBuffer.length, end - given)));
      if (count === 0) return;
      update(gapBuffer.subarray(0, count));
      given += count;
    }
  };

  return {
    size: source.size,
    read(offset, into) {
      if (offset < 0 || offset >= source.size) return 0;
      giveUpTo(offset);
      const wanted = into.subarray(0, Math.min(into.length, source.size - offset));
      const count = source.read(offset, wanted);
      // Where the gap could not be read (the file shrank), bytes behind it must not be given out of order.
      if (given >= offset && offset + count > given) {
        update(wanted.subarray(given - offset, count));
        given = offset + count;
      }
      return count;
    },
    finish() {
      giveUpTo(source.size);
      return given;
    },
  };
}
