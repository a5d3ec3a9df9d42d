import { execFileSync } from 'node:child_process';
import {
  existsSync,
  linkSync,
  mkdirSync,
  mkdtempSync,
  renameSync,
  rmSync,
  symlinkSync,
  unlinkSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { DropFolder } from '../../src/acquisition/drop-folder.ts';
import { pathBytes } from '../../src/acquisition/file-name.ts';
import { type Sweep, sweepFolder } from '../../src/acquisition/sweep.ts';

const made: string[] = [];
afterEach(() => {
  for (const folder of made.splice(0)) rmSync(folder, { recursive: true, force: true });
});

/** A folder in memory where there is one: ten thousand files take seconds on a disk. */
function dropFolder(inMemory = false): string {
  const where = inMemory && existsSync('/dev/shm') ? '/dev/shm' : tmpdir();
  const parent = mkdtempSync(join(where, 'drop-'));
  made.push(parent);
  const drop = join(parent, 'drop');
  mkdirSync(drop);
  return drop;
}

function read(sweep: Sweep): Extract<Sweep, { state: 'read' }> {
  if (sweep.state !== 'read') throw new Error(`not read: ${sweep.reason}`);
  return sweep;
}

describe('a sweep of the drop folder', () => {
  it('finds files in subfolders, sorted, and passes over hidden and unfinished ones', async () => {
    const drop = dropFolder();
    mkdirSync(join(drop, 'b'));
    mkdirSync(join(drop, '.hidden'));
    for (const name of [
      'z.wav',
      'b/a.csv',
      'B.wav',
      'a.part',
      '.x.wav',
      '.hidden/y.wav',
      '.humledger-0123',
    ]) {
      writeFileSync(join(drop, name), name);
    }
    const sweep = read(await sweepFolder(drop));
    expect(sweep.files.map((file) => file.path)).toEqual(['B.wav', 'b/a.csv', 'z.wav']);
    expect(sweep.files[0]).toMatchObject({ size: 5, nameProblem: null });
    expect(sweep.setAside).toEqual(['.humledger-0123']);
    expect(sweep.leftAlone).toEqual([]);
  });

  it('leaves links, pipes, sockets, devices and hard-linked files alone and says why', async () => {
    const drop = dropFolder();
    writeFileSync(join(drop, 'one.wav'), 'x');
    linkSync(join(drop, 'one.wav'), join(drop, 'two.wav'));
    symlinkSync('/etc/passwd', join(drop, 'link.wav'));
    symlinkSync('/', join(drop, 'folder-link'));
    execFileSync('mkfifo', [join(drop, 'pipe.wav')]);
    const sweep = read(await sweepFolder(drop));
    expect(sweep.files).toEqual([]);
    expect(sweep.leftAlone.map(({ path, reason }) => `${path}: ${reason}`)).toEqual([
      'folder-link: it is a link; links are not followed',
      'link.wav: it is a link; links are not followed',
      'one.wav: the file has 2 names (hard links); give it one',
      'pipe.wav: it is a pipe, not a file',
      'two.wav: the file has 2 names (hard links); give it one',
    ]);
  });

  it('reports names with control characters or stray bytes and gives a path that leads back to them', async () => {
    const drop = dropFolder();
    const stray = Buffer.from([0x61, 0xff, 0x2e, 0x77, 0x61, 0x76]);
    writeFileSync(Buffer.concat([Buffer.from(`${drop}/`), stray]), 'x');
    writeFileSync(join(drop, 'line\nbreak.wav'), 'x');
    const { files } = read(await sweepFolder(drop));
    expect(files.map((file) => file.nameProblem).sort()).toEqual([
      'its name holds control characters',
      'its name is not UTF-8',
    ]);
    expect(files.map((file) => pathBytes(file.path).toString('latin1')).sort()).toEqual([
      'a\xff.wav',
      'line\nbreak.wav',
    ]);
  });

  it('answers, and does not throw, when the folder is missing or is none', async () => {
    const drop = dropFolder();
    writeFileSync(join(drop, 'file'), '');
    expect(await sweepFolder(join(drop, 'nowhere'))).toMatchObject({ state: 'missing' });
    expect(await sweepFolder(join(drop, 'file'))).toMatchObject({ state: 'missing' });
  });

  it('passes over the data folder inside it, stops at its bounds and says that it did', async () => {
    const drop = dropFolder();
    mkdirSync(join(drop, 'data/archive'), { recursive: true });
    writeFileSync(join(drop, 'data/archive/old.wav'), '');
    mkdirSync(join(drop, 'a/b/c'), { recursive: true });
    writeFileSync(join(drop, 'a/b/c/deep.wav'), '');
    for (let n = 0; n < 200; n++) writeFileSync(join(drop, `f${n}.wav`), '');
    const sweep = read(await sweepFolder(drop, [join(drop, 'data')], { mostFiles: 100, deepest: 2 }));
    expect(sweep.cut).toBe(true);
    expect(sweep.files.length).toBeLessThan(200);
    expect(sweep.leftAlone.map((entry) => entry.path)).toEqual(['a/b/c']);
    expect(sweep.files.some((file) => file.path.startsWith('data/'))).toBe(false);
  });

  it('takes ten thousand files', async () => {
    const drop = dropFolder(true);
    for (let n = 0; n < 10_000; n++) writeFileSync(join(drop, `m_${n}.wav`), '');
    const sweep = read(await sweepFolder(drop));
    expect(sweep.files).toHaveLength(10_000);
    expect(sweep.cut).toBe(false);
  });
});

describe('the drop folder of a running service', () => {
  const watched: DropFolder[] = [];
  afterEach(async () => {
    for (const folder of watched.splice(0)) await folder.close();
  });

  /** A drop folder whose next hint can be awaited. */
  function watching(drop: string, polling = false): { folder: DropFolder; hinted: () => Promise<void> } {
    let wake = () => {};
    const folder = new DropFolder({ folder: drop, except: [], polling, hint: () => wake() });
    watched.push(folder);
    return {
      folder,
      hinted: () =>
        new Promise((resolve) => {
          wake = resolve;
        }),
    };
  }

  it.each([false, true])('hints at a new file (polling: %s)', async (polling) => {
    const drop = dropFolder();
    const { folder, hinted } = watching(drop, polling);
    const ready = hinted();
    expect(read(await folder.sweep()).files).toEqual([]);
    await ready;
    const next = hinted();
    writeFileSync(join(drop, 'a.wav'), 'x');
    await next;
    expect(read(await folder.sweep()).files).toHaveLength(1);
  });

  it('hints again after the folder was taken away and came back', async () => {
    const drop = dropFolder();
    const { folder, hinted } = watching(drop);
    const ready = hinted();
    await folder.sweep();
    await ready;
    renameSync(drop, `${drop}-away`);
    expect(await folder.sweep()).toMatchObject({ state: 'missing' });
    renameSync(`${drop}-away`, drop);
    const readyAgain = hinted();
    expect(await folder.sweep()).toMatchObject({ state: 'read' });
    await readyAgain;
    const next = hinted();
    writeFileSync(join(drop, 'a.wav'), 'x');
    await next;
  });

  it('hints again when another folder was put in its place between two sweeps', async () => {
    const drop = dropFolder();
    const { folder, hinted } = watching(drop);
    const ready = hinted();
    await folder.sweep();
    await ready;
    renameSync(drop, `${drop}-away`);
    mkdirSync(drop);
    const readyAgain = hinted();
    await folder.sweep();
    await readyAgain;
    const next = hinted();
    writeFileSync(join(drop, 'a.wav'), 'x');
    await next;
  });

  it('tells what it leaves alone once, and again when it came back', async () => {
    const drop = dropFolder();
    const { folder } = watching(drop);
    const link = join(drop, 'link.wav');
    symlinkSync('/etc/passwd', link);
    expect(read(await folder.sweep()).leftAlone).toHaveLength(1);
    expect(read(await folder.sweep()).leftAlone).toEqual([]);
    unlinkSync(link);
    expect(read(await folder.sweep()).leftAlone).toEqual([]);
    symlinkSync('/etc/passwd', link);
    expect(read(await folder.sweep()).leftAlone).toHaveLength(1);
  });
});
