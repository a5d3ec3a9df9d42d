import { createHash } from 'node:crypto';
import {
  existsSync,
  linkSync,
  lstatSync,
  mkdirSync,
  mkdtempSync,
  readdirSync,
  readFileSync,
  renameSync,
  rmSync,
  statfsSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, describe, expect, it } from 'vitest';
import { longestNameBytes, pathText } from '../../src/acquisition/file-name.ts';
import {
  completeFiling,
  type FiledFile,
  type FilingOrder,
  type FilingStep,
} from '../../src/acquisition/filing.ts';
import {
  archivePlace,
  quarantinePlace,
  setAsidePath,
  unassignedPlace,
} from '../../src/acquisition/filing-place.ts';

/** Real folders; `/dev/shm` is a file system of its own on Linux, so the way across file systems is the real one. */
const made: string[] = [];
afterEach(() => {
  for (const folder of made.splice(0)) rmSync(folder, { recursive: true, force: true });
});

function folder(parent = tmpdir()): string {
  const path = mkdtempSync(join(parent, 'filing-'));
  made.push(path);
  return path;
}

const otherFileSystem = '/dev/shm';
const canCross = existsSync(otherFileSystem) && lstatSync(otherFileSystem).dev !== lstatSync(tmpdir()).dev;

const sha256 = (content: string | Buffer) => createHash('sha256').update(content).digest('hex');

function fileOf(dropFolder: string, name: string, content: string): FiledFile {
  const path = join(dropFolder, name);
  writeFileSync(path, content);
  const { dev, ino, size, mtimeMs } = lstatSync(path);
  return { from: name, sha256: sha256(content), look: { dev, ino, size, mtimeMs } };
}

interface Scene {
  readonly order: FilingOrder;
  readonly drop: string;
  readonly data: string;
}

const usedMs = Date.UTC(2026, 10, 3, 9, 30);

function scene(dataParent = tmpdir(), how: 'archive' | 'quarantine' | 'delete' = 'archive'): Scene {
  const drop = folder();
  const data = folder(dataParent);
  mkdirSync(join(drop, 'sub'));
  const recording = fileOf(drop, 'sub/a.wav', 'recording');
  const sidecar = fileOf(drop, 'sub/a.json', '{}');
  const to = {
    archive: archivePlace('sub/a.wav', usedMs, recording.sha256),
    quarantine: quarantinePlace('sub/a.wav', recording.sha256),
    delete: null,
  }[how];
  const reason = how === 'quarantine' ? 'a.wav: no RIFF at byte 0; export it again' : null;
  return { drop, data, order: { ...recording, dropFolder: drop, dataFolder: data, to, reason, sidecar } };
}

/** Every file below a folder with its content. */
function contents(root: string): Record<string, string> {
  return Object.fromEntries(
    readdirSync(root, { recursive: true, withFileTypes: true })
      .filter((entry) => entry.isFile())
      .map((entry) => {
        const path = join(entry.parentPath, entry.name);
        return [path.slice(root.length + 1), readFileSync(path, 'utf8')];
      }),
  );
}

const afterRestart = (order: FilingOrder): FilingOrder => ({
  ...order,
  look: null,
  sidecar: order.sidecar && { ...order.sidecar, look: null },
});

const passing = { step: () => {} };

describe('filing', () => {
  it('moves a recording and its sidecar to the archive of its day', async () => {
    const { order, drop, data } = scene();
    expect(await completeFiling(order, passing)).toEqual({
      outcome: 'filed',
      to: 'archive/2026/11/03/a.wav',
      sidecar: 'filed',
    });
    expect(contents(drop)).toEqual({});
    expect(contents(data)).toEqual({
      'archive/2026/11/03/a.wav': 'recording',
      'archive/2026/11/03/a.json': '{}',
    });
  });

  it('writes the reason beside a quarantined file', async () => {
    const { order, data } = scene(tmpdir(), 'quarantine');
    await completeFiling(order, passing);
    expect(contents(data)['quarantine/a.wav.reason.txt']).toBe('a.wav: no RIFF at byte 0; export it again\n');
    expect(contents(data)['quarantine/a.wav']).toBe('recording');
  });

  it('keeps another file of the same name and marks the second with its hash', async () => {
    const { order, data } = scene();
    mkdirSync(join(data, 'archive/2026/11/03'), { recursive: true });
    writeFileSync(join(data, 'archive/2026/11/03/a.wav'), 'another');
    const mark = order.sha256.slice(0, 8);
    expect(await completeFiling(order, passing)).toMatchObject({ to: `archive/2026/11/03/a.wav~${mark}` });
    expect(contents(data)).toEqual({
      'archive/2026/11/03/a.wav': 'another',
      [`archive/2026/11/03/a.wav~${mark}`]: 'recording',
      [`archive/2026/11/03/a~${mark}.json`]: '{}',
    });
  });

  it('does not keep the same content under the same name twice', async () => {
    const first = scene();
    await completeFiling(first.order, passing);
    const again = fileOf(first.drop, 'sub/a.wav', 'recording');
    await completeFiling({ ...first.order, ...again, sidecar: null }, passing);
    expect(Object.keys(contents(first.data))).toEqual(
      expect.arrayContaining(['archive/2026/11/03/a.wav', 'archive/2026/11/03/a.json']),
    );
    expect(Object.keys(contents(first.data))).toHaveLength(2);
    expect(contents(first.drop)).toEqual({});
  });

  it('puts back a file that came under the name after the recording was read', async () => {
    const { order, drop, data } = scene();
    // Same name, same length, another file: a logger replaces by renaming.
    writeFileSync(join(drop, 'sub/new'), 'RECORDING');
    renameSync(join(drop, 'sub/new'), join(drop, 'sub/a.wav'));
    expect(await completeFiling(order, passing)).toEqual({ outcome: 'replaced' });
    expect(contents(drop)['sub/a.wav']).toBe('RECORDING');
    expect(contents(data)).toEqual({});
  });

  it('puts back a file that came between the look and the rename, even where the name is taken again', async () => {
    const { order, drop } = scene();
    const held = join(drop, setAsidePath(order));
    writeFileSync(held, 'NEW ARRIVAL');
    rmSync(join(drop, 'sub/a.wav'));
    expect(await completeFiling(order, passing)).toEqual({ outcome: 'replaced' });
    expect(contents(drop)['sub/a.wav']).toBe('NEW ARRIVAL');

    const second = scene();
    writeFileSync(join(second.drop, setAsidePath(second.order)), 'NEW ARRIVAL');
    await completeFiling(second.order, passing);
    expect(Object.values(contents(second.drop)).sort()).toEqual(['NEW ARRIVAL', 'recording', '{}'].sort());
  });

  it('says so when somebody took the file away', async () => {
    const { order, drop } = scene();
    rmSync(join(drop, 'sub/a.wav'));
    expect(await completeFiling(order, passing)).toEqual({ outcome: 'gone' });
  });

  it('reports a disk that refuses as a value and leaves everything in place', async () => {
    const { order, drop, data } = scene();
    writeFileSync(join(data, 'archive'), 'a file where the folder should be');
    const answer = await completeFiling(order, passing);
    expect(answer).toMatchObject({ outcome: 'cannot' });
    expect(Object.values(contents(drop)).sort()).toEqual(['recording', '{}'].sort());
    rmSync(join(data, 'archive'));
    expect(await completeFiling(afterRestart(order), passing)).toMatchObject({ outcome: 'filed' });
    expect(contents(drop)).toEqual({});
  });

  it('gives names that cannot be kept a made-up one, and cuts those that leave no room', () => {
    const hash = sha256('x');
    expect(
      quarantinePlace(pathText(Buffer.from([0x73, 0x2f, 0xff, 0x61, 0x2e, 0x77, 0x61, 0x76])), hash),
    ).toBe(`quarantine/unnamed-${hash.slice(0, 8)}.wav`);
    expect(unassignedPlace(pathText(Buffer.from('a\nb.csv')), hash)).toBe(
      `unassigned/unnamed-${hash.slice(0, 8)}.csv`,
    );
    const long = archivePlace(`${'ü'.repeat(120)}.wav`, usedMs, hash)
      .split('/')
      .at(-1) as string;
    expect(long).toMatch(/^ü+\.wav$/);
    expect(Buffer.byteLength(`${long}~12345678~2.reason.txt`)).toBeLessThanOrEqual(longestNameBytes);
  });

  it('files a file whose name is not UTF-8', async () => {
    const drop = folder();
    const data = folder();
    const bytes = Buffer.from([0xff, 0xfe, 0x2e, 0x77, 0x61, 0x76]);
    writeFileSync(Buffer.concat([Buffer.from(`${drop}/`), bytes]), 'recording');
    const from = pathText(bytes);
    const order: FilingOrder = {
      dropFolder: drop,
      dataFolder: data,
      from,
      sha256: sha256('recording'),
      look: null,
      to: quarantinePlace(from, sha256('recording')),
      reason: 'its name is not UTF-8',
      sidecar: null,
    };
    expect(await completeFiling(order, passing)).toMatchObject({ outcome: 'filed' });
    expect(readdirSync(drop)).toEqual([]);
    expect(Object.values(contents(data))).toContain('recording');
  });

  it('leaves a hard-linked twin of the recording alone', async () => {
    const { order, drop } = scene();
    linkSync(join(drop, 'sub/a.wav'), join(drop, 'sub/twin.wav'));
    await completeFiling(order, passing);
    expect(contents(drop)).toEqual({ 'sub/twin.wav': 'recording' });
  });
});

describe('filing that is stopped', () => {
  const cases = [
    { how: 'archive', across: false },
    { how: 'quarantine', across: false },
    { how: 'delete', across: false },
    { how: 'archive', across: true },
    { how: 'quarantine', across: true },
  ] as const;

  it.each(cases)(
    'at any of its steps ends the same when it is resumed: $how, across file systems $across',
    async ({ how, across }) => {
      if (across) expect(canCross, 'a second file system at /dev/shm').toBe(true);
      const parent = across ? otherFileSystem : tmpdir();
      const whole = scene(parent, how);
      const steps: FilingStep[] = [];
      const outcome = await completeFiling(whole.order, { step: (name) => steps.push(name) });
      const wanted = { drop: contents(whole.drop), data: contents(whole.data) };
      expect(steps.length).toBeGreaterThanOrEqual(how === 'delete' ? 4 : 6);
      for (let stop = 0; stop < steps.length; stop++) {
        const { order, drop, data } = scene(parent, how);
        let passed = 0;
        const step = (name: FilingStep) => {
          if (passed++ === stop) throw new Error(`stopped at ${name}`);
        };
        await expect(completeFiling(order, { step })).rejects.toThrow(`stopped at ${steps[stop]}`);
        // Never without the content under some name, unless it was to be deleted.
        const left = [...Object.values(contents(drop)), ...Object.values(contents(data))];
        if (how !== 'delete') expect(left).toEqual(expect.arrayContaining(['recording', '{}']));
        expect(await completeFiling(afterRestart(order), passing)).toEqual(outcome);
        expect({ drop: contents(drop), data: contents(data) }).toEqual(wanted);
        // Carried out once more, it changes nothing.
        expect(await completeFiling(afterRestart(order), passing)).toEqual(outcome);
        expect({ drop: contents(drop), data: contents(data) }).toEqual(wanted);
      }
    },
  );

  it('half way through a copy begins the copy anew', async () => {
    if (!canCross) return expect(statfsSync(tmpdir()).type).toBeDefined();
    const { order, data } = scene(otherFileSystem);
    mkdirSync(join(data, 'archive/2026/11/03'), { recursive: true });
    writeFileSync(join(data, 'archive/2026/11/03/a.wav.part'), 'recor');
    await completeFiling(order, passing);
    expect(contents(data)).toEqual({
      'archive/2026/11/03/a.wav': 'recording',
      'archive/2026/11/03/a.json': '{}',
    });
  });
});
