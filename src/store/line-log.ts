import {
  closeSync,
  existsSync,
  fstatSync,
  fsyncSync,
  mkdirSync,
  openSync,
  readSync,
  writeSync,
} from 'node:fs';
import { dirname } from 'node:path';
import { syncFile } from './backup.ts';

/**
 * A file of lines of JSON beside the ledger, to which is only ever added: what must outlive the ledger itself, so that one
 * that was put back from a backup can be told what it lacks. A line that a power cut broke off is skipped.
 */
const newline = 10;

/** Adds the lines and forces them to the disk; returns the size of the file then. Throws what the disk says. */
export function appendLines(path: string, lines: readonly object[]): number {
  const isNew = !existsSync(path);
  if (isNew) mkdirSync(dirname(path), { recursive: true });
  const descriptor = openSync(path, 'a+');
  try {
    const { size } = fstatSync(descriptor);
    const last = new Uint8Array(1);
    const broken = size > 0 && readSync(descriptor, last, 0, 1, size - 1) === 1 && last[0] !== newline;
    const text = lines.map((line) => `${JSON.stringify(line)}\n`).join('');
    writeSync(descriptor, broken ? `\n${text}` : text);
    fsyncSync(descriptor);
    if (isNew) syncFile(dirname(path));
    return fstatSync(descriptor).size;
  } finally {
    closeSync(descriptor);
  }
}

export interface LinesRead {
  /** Every line that is JSON, oldest first. */
  readonly lines: readonly unknown[];
  /** Size of the file: where to go on the next time. */
  readonly size: number;
}

/** The lines from a byte on, the newest where there are more than `mostBytes`; none where there is no such file. */
export function readLines(path: string, fromByte: number, mostBytes: number): LinesRead {
  if (!existsSync(path)) return { lines: [], size: 0 };
  const descriptor = openSync(path, 'r');
  try {
    const { size } = fstatSync(descriptor);
    // A file that is shorter than it was is another one.
    const wanted = fromByte > size ? 0 : fromByte;
    const from = Math.max(wanted, size - mostBytes);
    const bytes = Buffer.alloc(size - from);
    const count = readSync(descriptor, bytes, 0, bytes.length, from);
    const lines = bytes.subarray(0, count).toString('utf8').split('\n').flatMap(parsed);
    return { lines, size };
  } finally {
    closeSync(descriptor);
  }
}

function parsed(line: string): unknown[] {
  try {
    return line === '' ? [] : [JSON.parse(line)];
  } catch {
    return [];
  }
}
