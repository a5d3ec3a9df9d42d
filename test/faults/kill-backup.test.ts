/**
 * A backup is killed at every one of its steps while the service takes recordings: the service and its ledger do not feel
 * it, no half backup bears a backup's name, and the next backup clears what it left.
 */
import { spawnSync } from 'node:child_process';
import { existsSync, mkdirSync, readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import Database from 'better-sqlite3';
import { afterAll, describe, expect, it } from 'vitest';
import type { Step } from '../../src/service/steps.ts';
import { backupLedger } from '../../src/store/backup.ts';
import { backupSteps } from '../../src/store/ledger-steps.ts';
import { ledgerPath } from '../../src/store/open-ledger.ts';
import { serviceOn, site } from '../service/trial.ts';
import { playStory } from './story.ts';
import { removeTemplate, storyRun, undisturbedRun } from './story-run.ts';

afterAll(removeTemplate);

const child = fileURLToPath(new URL('./backup-child.ts', import.meta.url));

function killedBackup(data: string, file: string, step: string) {
  const { signal, stderr } = spawnSync(process.execPath, [child, ledgerPath(data), file, step], {
    encoding: 'utf8',
  });
  return { signal, stderr };
}

/** Recordings in a whole copy; throws where it is none. */
function recordingsIn(file: string): number {
  const copy = new Database(file, { readonly: true });
  try {
    expect(copy.pragma('integrity_check', { simple: true })).toBe('ok');
    return copy.prepare('select count(*) from recordings').pluck().get() as number;
  } finally {
    copy.close();
  }
}

describe('a backup that is killed', () => {
  it('at any step while recordings are taken leaves the service and its ledger as an undisturbed run does', async () => {
    const whole = await undisturbedRun(null);
    const run = await storyRun(null);
    const target = join(run.folder, 'backups');
    mkdirSync(target);
    const left = [...backupSteps, 'half copied'];
    const killed: unknown[] = [];
    const interrupting: Step = (name) => {
      if (name !== 'intake: decision committed') return;
      const step = left.shift();
      if (step === undefined) return;
      const file = join(target, `${left.length}.sqlite`);
      const { signal, stderr } = killedBackup(run.data, file, step);
      killed.push({ signal, stderr, named: existsSync(file), part: existsSync(`${file}.part`) });
    };
    await playStory(run.folder, interrupting);
    expect(left).toEqual([]);
    const part = { signal: 'SIGKILL', stderr: '', named: false, part: true };
    expect(killed).toEqual([part, part, part, part, { ...part, named: true, part: false }, part]);
    expect(run.state()).toEqual(whole.state);
    expect(run.received().length).toBe(new Set(run.received()).size);
    // The one that has its name is whole, of the moment at which it was begun; the others are made now under theirs.
    const names = [5, 4, 3, 2, 0].map((n) => `${n}.sqlite`);
    expect(recordingsIn(join(target, '1.sqlite'))).toBe(5);
    for (const name of names) {
      const done = await backupLedger(ledgerPath(run.data), join(target, name));
      expect(done).toMatchObject({ file: join(target, name) });
      expect(recordingsIn(join(target, name))).toBe(9);
    }
    expect(readdirSync(target).sort()).toEqual(['0', '1', '2', '3', '4', '5'].map((n) => `${n}.sqlite`));
  });

  it('leaves behind what the next backup of that name clears, however little it had written', async () => {
    const on = site();
    const service = await serviceOn(on);
    await service.hour(0);
    const file = join(on.folder, 'copy.sqlite');
    const bytes = readFileSync(ledgerPath(on.data));
    for (const left of [0, 100, 4096, bytes.length / 2]) {
      writeFileSync(`${file}.part`, bytes.subarray(0, left));
      writeFileSync(`${file}.part-journal`, bytes.subarray(0, 512));
      const target = file.replace('copy', `copy-${left}`);
      for (const path of ['', '-journal'])
        writeFileSync(`${target}.part${path}`, readFileSync(`${file}.part${path}`));
      expect(await backupLedger(ledgerPath(on.data), target)).toMatchObject({ file: target });
      expect(recordingsIn(target)).toBe(2);
      expect(existsSync(`${target}.part`) || existsSync(`${target}.part-journal`)).toBe(false);
    }
  });
});

describe('two backups to one name at a time', () => {
  it('leave one whole backup, whoever was first', async () => {
    const on = site();
    const service = await serviceOn(on);
    await service.hour(0);
    const file = join(on.folder, 'copy.sqlite');
    let other: ReturnType<typeof backupLedger> | null = null;
    // The second begins when the first has checked its copy, and takes its part away.
    const first = await backupLedger(ledgerPath(on.data), file, (name) => {
      if (name === 'backup: checked') other = backupLedger(ledgerPath(on.data), file);
    });
    expect(first).toMatchObject({ refused: 'busy', reason: expect.stringContaining('another backup') });
    expect(existsSync(file)).toBe(false);
    expect(await other).toMatchObject({ file, bytes: statSync(file).size });
    expect(recordingsIn(file)).toBe(2);
    expect(readdirSync(on.folder).filter((name) => name.includes('.part'))).toEqual([]);
  });
});
