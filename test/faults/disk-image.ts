import { execFileSync, spawnSync } from 'node:child_process';
import { copyFileSync, mkdirSync, mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { onTestFinished } from 'vitest';

/** A small file system of its own in a file, or in memory; only where mounting is allowed. */
const megabytes = 24;

function tryMount(): boolean {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-mount-'));
  try {
    const image = join(folder, 'image');
    return (
      spawnSync('truncate', ['-s', '4M', image]).status === 0 &&
      spawnSync('mkfs.ext4', ['-q', '-F', image]).status === 0 &&
      spawnSync('mount', ['-o', 'loop', image, mkdirIn(folder, 'on')]).status === 0 &&
      spawnSync('umount', [join(folder, 'on')]).status === 0
    );
  } finally {
    rmSync(folder, { recursive: true, force: true });
  }
}

function mkdirIn(folder: string, name: string): string {
  const path = join(folder, name);
  mkdirSync(path);
  return path;
}

export const canMount: boolean = tryMount();
export const leftOutWithoutMount = canMount ? '' : ' (left out: mounting is not allowed here)';

/** Mounts until the test is over, or until it is let go of. */
function mounted(args: readonly string[], on: string): () => void {
  execFileSync('mount', [...args, on]);
  let gone = false;
  const letGo = () => {
    if (!gone) execFileSync('umount', [on]);
    gone = true;
  };
  onTestFinished(letGo);
  return letGo;
}

export interface DiskImage {
  readonly folder: string;
  /** What a power cut at this moment would leave: what was forced to the disk, and no more. Mounted until `letGo`. */
  cut(): { readonly folder: string; letGo(): void };
}

/** A disk that writes nothing by itself for ten minutes; what is forced to it is at once in its image. */
export function diskImage(): DiskImage {
  const own = mkdtempSync(join(tmpdir(), 'humledger-disk-'));
  onTestFinished(() => rmSync(own, { recursive: true, force: true }));
  const image = join(own, 'image');
  execFileSync('truncate', ['-s', `${megabytes}M`, image]);
  execFileSync('mkfs.ext4', ['-q', '-F', '-E', 'lazy_itable_init=0,lazy_journal_init=0', image]);
  const folder = mkdirIn(own, 'disk');
  mounted(['-o', 'loop,commit=600', image], folder);
  let cuts = 0;
  return {
    folder,
    cut: () => {
      const copy = join(own, `cut-${++cuts}`);
      copyFileSync(image, copy);
      const at = mkdirIn(own, `after-${cuts}`);
      const unmount = mounted(['-o', 'loop', copy], at);
      return {
        folder: at,
        letGo: () => {
          unmount();
          rmSync(copy);
        },
      };
    },
  };
}

/** A file system in memory of so many bytes, gone when the test is over. */
export function smallDisk(bytes: number): string {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-small-'));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  mounted(['-t', 'tmpfs', '-o', `size=${bytes}`, 'tmpfs'], folder);
  return folder;
}
