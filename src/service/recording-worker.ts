import { createHash } from 'node:crypto';
import { basename } from 'node:path';
import { hashingSource, readFully, readHead } from '../acquisition/byte-source.ts';
import { readerFor } from '../acquisition/readers.ts';
import { type ByteSource, isRefusal } from '../acquisition/recording.ts';
import { allZeros, tailBytes } from '../acquisition/settling.ts';
import { largestSidecarBytes, parseSidecar } from '../acquisition/sidecar.ts';
import { openRegularFile, sameFile } from './file-source.ts';
import { layoutOf, readRecording } from './read-recording.ts';
import type {
  HashAnswer,
  HashTask,
  HeaderAnswer,
  HeaderTask,
  MeasureAnswer,
  MeasureTask,
  RecordingTask,
  SidecarRead,
} from './recording-task.ts';

/** Entry of a worker thread: everything that reads a recording happens here, on one descriptor, in blocks. */
export default async function work(task: RecordingTask): Promise<HeaderAnswer | MeasureAnswer | HashAnswer> {
  switch (task.task) {
    case 'header':
      return readHeader(task);
    case 'measure':
      return measure(task);
    case 'hash':
      return hashFile(task);
  }
}

async function readHeader(task: HeaderTask): Promise<HeaderAnswer> {
  const file = openRegularFile(task.path, task.largestBytes);
  if ('reason' in file) return file.gone ? { kind: 'gone' } : { kind: 'left-alone', reason: file.reason };
  try {
    const head = readHead(file.source);
    const reader = readerFor(head, basename(task.path));
    if (!isRefusal(reader)) await reader.prepare?.();
    const header = isRefusal(reader) ? reader : reader.header(file.source, task.layout);
    if (isRefusal(header)) return { kind: 'refused', refusal: header, headIsZeros: allZeros(head) };
    const beside = task.sidecarPath === null ? null : readSidecar(task.sidecarPath);
    return {
      kind: 'header',
      look: file.first,
      header,
      sidecar: beside !== null && 'content' in beside ? beside : null,
      sidecarRefused: beside !== null && 'reason' in beside ? beside.reason : null,
      zeroTail: hasZeroTail(file.source),
    };
  } finally {
    file.close();
  }
}

async function measure(task: MeasureTask): Promise<MeasureAnswer> {
  const file = openRegularFile(task.path, task.largestBytes);
  if ('reason' in file) return { kind: file.gone ? 'gone' : 'changed' };
  try {
    if (!sameFile(file.first, task.seen)) return { kind: 'changed' };
    const hash = createHash('sha256');
    const source = hashingSource(file.source, (bytes) => hash.update(bytes));
    const reader = readerFor(readHead(source), basename(task.path));
    if (!isRefusal(reader)) await reader.prepare?.();
    const header = isRefusal(reader) ? reader : reader.header(source, layoutOf(task.points));
    const read =
      isRefusal(reader) || isRefusal(header)
        ? null
        : readRecording(source, reader, header, sidecarOf(task), task.points);
    const given = source.finish();
    if (given !== file.source.size || !sameFile(file.look(), file.first)) return { kind: 'changed' };
    const sha256 = hash.digest('hex');
    if (isRefusal(header)) return { kind: 'refused', look: file.first, sha256, refusal: header };
    if (read === null || isRefusal(read)) {
      const refusal = read ?? { refused: 'foreign' as const, reason: 'no reader knows this file' };
      return { kind: 'refused', look: file.first, sha256, refusal };
    }
    return { kind: 'measured', look: file.first, sha256, header, ...read };
  } finally {
    file.close();
  }
}

function hashFile(task: HashTask): HashAnswer {
  const path = typeof task.path === 'string' ? task.path : Buffer.from(task.path);
  const file = openRegularFile(path, task.largestBytes);
  if ('reason' in file) return { kind: file.gone ? 'gone' : 'left-alone' };
  try {
    const hash = createHash('sha256');
    const source = hashingSource(file.source, (bytes) => hash.update(bytes));
    source.finish();
    return { kind: 'hashed', look: file.first, sha256: hash.digest('hex') };
  } finally {
    file.close();
  }
}

/** The sidecar as the header pass found it; it was read and checked there. */
function sidecarOf(task: MeasureTask) {
  return task.sidecar?.content ?? null;
}

/** Null where there is none. */
export function readSidecar(path: string): SidecarRead | { readonly reason: string } | null {
  const file = openRegularFile(path, largestSidecarBytes);
  if ('reason' in file) return file.gone ? null : { reason: `sidecar ${file.reason}` };
  try {
    const bytes = new Uint8Array(file.source.size);
    const content = parseSidecar(bytes.subarray(0, readFully(file.source, 0, bytes)));
    if ('reason' in content) return content;
    return { sha256: createHash('sha256').update(bytes).digest('hex'), look: file.first, content };
  } finally {
    file.close();
  }
}

function hasZeroTail(source: ByteSource): boolean {
  const tail = new Uint8Array(Math.min(tailBytes, source.size));
  return tail.length > 0 && readFully(source, source.size - tail.length, tail) > 0 && allZeros(tail);
}
