import { closeSync, constants, fstatSync, openSync, readSync } from 'node:fs';
import type { ByteSource } from '../acquisition/recording.ts';

/** What tells whether a path still leads to the same, unchanged file. */
export interface FileLook {
  readonly dev: number;
  readonly ino: number;
  readonly size: number;
  readonly mtimeMs: number;
  readonly ctimeMs: number;
}

export interface OpenFile {
  readonly source: ByteSource;
  readonly first: FileLook;
  /** Looks at the open descriptor again. */
  look(): FileLook;
  close(): void;
}

/**
 * Opens a file for reading once: not following links, not blocking (a FIFO opened plainly stops every later file
 * operation of the process). Answers in words when it is not a regular file with one link and a size in bounds.
 */
export function openRegularFile(
  path: string | Uint8Array,
  largestBytes: number,
): OpenFile | { readonly reason: string; readonly gone: boolean } {
  let descriptor: number;
  try {
    descriptor = openSync(
      typeof path === 'string' ? path : Buffer.from(path),
      constants.O_RDONLY | (constants.O_NOFOLLOW ?? 0) | (constants.O_NONBLOCK ?? 0),
    );
  } catch (error) {
    const code = (error as NodeJS.ErrnoException).code ?? 'unknown error';
    if (code === 'ELOOP') return { reason: 'is a link; links are left alone', gone: false };
    return { reason: `cannot be opened: ${code}`, gone: code === 'ENOENT' };
  }
  const refuse = (reason: string) => {
    closeSync(descriptor);
    return { reason, gone: false };
  };
  const stat = fstatSync(descriptor);
  if (!stat.isFile()) return refuse('is not a regular file');
  if (stat.nlink !== 1) return refuse(`has ${stat.nlink} hard links; only files with one name are taken`);
  if (stat.size > largestBytes)
    return refuse(`has ${stat.size} bytes; more than ${largestBytes} are not read`);
  const look = (): FileLook => {
    const now = fstatSync(descriptor);
    return { dev: now.dev, ino: now.ino, size: now.size, mtimeMs: now.mtimeMs, ctimeMs: now.ctimeMs };
  };
  return {
    source: {
      size: stat.size,
      read: (offset, into) => readSync(descriptor, into, 0, into.length, offset),
    },
    first: look(),
    look,
    close: () => closeSync(descriptor),
  };
}

export function sameFile(a: FileLook, b: FileLook): boolean {
  return (
    a.dev === b.dev &&
    a.ino === b.ino &&
    a.size === b.size &&
    a.mtimeMs === b.mtimeMs &&
    a.ctimeMs === b.ctimeMs
  );
}
