import { createHash } from 'node:crypto';
import { createReadStream } from 'node:fs';
import { lstat, open, rm } from 'node:fs/promises';

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

/** Forces a folder's entries to the disk. */
export async function syncFolder(path: string): Promise<void> {
  const folder = await open(path, 'r');
  try {
    await folder.sync();
  } finally {
    await folder.close();
  }
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
