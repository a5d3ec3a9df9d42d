import { createHash } from 'node:crypto';
import { createReadStream } from 'node:fs';
import { lstat, mkdir, open, rename, rm } from 'node:fs/promises';
import { dirname } from 'node:path';
import { splitEnding } from './file-name.ts';

const partBytes = 1 << 20;

/**
 * Copies a file across file systems to a path of its own, with its times, forces it to the disk and reads it back.
 * What an earlier attempt left there is removed first. Throws when the copy does not have the hash.
 */
export async function copyInto(from: Buffer, to: string, sha256: string): Promise<void> {
  await rm(to, { force: true });
  const source = await open(from, 'r');
  try {
    const { mode, atime, mtime } = await source.stat();
    const target = await open(to, 'wx+', mode & 0o777);
    try {
      await forEachPart(source, async (part, position) => {
        for (let written = 0; written < part.length; ) {
          const { bytesWritten } = await target.write(
            part,
            written,
            part.length - written,
            position + written,
          );
          written += bytesWritten;
        }
      });
      await target.utimes(atime, mtime);
      await target.sync();
      const hash = createHash('sha256');
      await forEachPart(target, async (part) => {
        hash.update(part);
      });
      const found = hash.digest('hex');
      if (found !== sha256) {
        throw Object.assign(new Error(`the copy at ${to} differs from what was read`), {
          code: 'EIO',
          syscall: 'compare',
        });
      }
    } finally {
      await target.close();
    }
  } finally {
    await source.close();
  }
}

type FileHandle = Awaited<ReturnType<typeof open>>;

async function forEachPart(
  file: FileHandle,
  take: (part: Uint8Array, position: number) => Promise<void>,
): Promise<void> {
  const buffer = Buffer.alloc(partBytes);
  for (let position = 0; ; ) {
    const { bytesRead } = await file.read(buffer, 0, buffer.length, position);
    if (bytesRead === 0) return;
    await take(buffer.subarray(0, bytesRead), position);
    position += bytesRead;
  }
}

/** Forces a folder's entries, or a file's content, to the disk. */
export async function forceToDisk(path: string | Buffer): Promise<void> {
  const opened = await open(path, 'r');
  try {
    await opened.sync();
  } finally {
    await opened.close();
  }
}

/** Makes a folder with all above it; what was made is there after a power cut too. */
export async function makeFolder(path: string): Promise<void> {
  const first = await mkdir(path, { recursive: true });
  if (first === undefined) return;
  for (let made = path; made.length >= first.length; made = dirname(made)) await forceToDisk(dirname(made));
}

/** Renames in one file system; content and new name are on the disk when this returns, whatever the writer forced there. */
export async function renameForGood(from: Buffer, to: string): Promise<void> {
  await forceToDisk(from);
  await rename(from, to);
  await forceToDisk(dirname(to));
}

/** Gives a new arrival its name back, or one beside it where yet another file has taken the name. */
export async function putBack(held: Buffer, from: Buffer): Promise<void> {
  if (!(await exists(from))) return rename(held, from);
  const { ino } = await lstat(held);
  const at = from.lastIndexOf(0x2f) + 1;
  const { stem, ending } = splitEnding(from.subarray(at).toString('latin1'));
  const name = Buffer.from(`${stem.slice(0, 200)}~${ino}${ending.slice(-16)}`, 'latin1');
  await rename(held, Buffer.concat([from.subarray(0, at), name]));
}

/** SHA-256 of a regular file, read in parts; null for anything else. */
export async function contentSha256(path: Buffer): Promise<string | null> {
  const found = await lstat(path);
  if (!found.isFile()) return null;
  const hash = createHash('sha256');
  for await (const part of createReadStream(path)) hash.update(part);
  return hash.digest('hex');
}

export async function exists(path: Buffer): Promise<boolean> {
  try {
    await lstat(path);
    return true;
  } catch (error) {
    if (isSystemError(error) && (error.code === 'ENOENT' || error.code === 'ENOTDIR')) return false;
    throw error;
  }
}

/** An error of the operating system, with its code and call. */
export function isSystemError(error: unknown): error is NodeJS.ErrnoException {
  return error instanceof Error && 'syscall' in error && 'code' in error;
}
