/**
 * Commands beside the running service: a real process of `run`, recordings pouring in all the while, and every command
 * that a person may give meanwhile. Nothing is lost, nothing is held up, each command does what it says.
 */
import { type ChildProcess, spawn } from 'node:child_process';
import { once } from 'node:events';
import { readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { createInterface } from 'node:readline';
import { setImmediate } from 'node:timers/promises';
import { fileURLToPath } from 'node:url';
import Database from 'better-sqlite3';
import { expect, it, onTestFinished } from 'vitest';
import { main } from '../../src/cli/main.ts';
import { MailServerOnLoopback } from '../service/mail-server.ts';
import { filesBelow, makeSite, type SiteOnDisk, stamp, wav } from '../service/site-on-disk.ts';

const program = fileURLToPath(new URL('../../src/cli/start.ts', import.meta.url));
/** On a machine that does a lot besides; a command that waits for the service would wait for ever. */
const longestCommandMs = 20_000;

interface Said {
  readonly status: number;
  readonly out: string;
  readonly err: string;
}

class Beside {
  readonly site: SiteOnDisk;
  readonly child: ChildProcess;
  readonly log: { readonly level: string; readonly msg: string }[] = [];
  readonly names: string[] = [];
  slowestMs = 0;
  readonly #beginMs = Date.now() - 200_000;
  #next = 0;

  constructor(site: SiteOnDisk) {
    this.site = site;
    this.child = spawn(process.execPath, [program, 'run'], {
      cwd: site.folder,
      stdio: ['ignore', 'pipe', 'inherit'],
    });
    createInterface({ input: this.child.stdout as NodeJS.ReadableStream }).on('line', (line) =>
      this.log.push(JSON.parse(line)),
    );
    onTestFinished(() => {
      this.child.kill('SIGKILL');
    });
  }

  /** A second of the loggers: one recording of each machine, the pump far over its limit. */
  pour(): void {
    for (const [machine, levels] of [
      ['press-1', [1, 1]],
      ['pump-2', [9]],
    ] as const) {
      const name = `${machine}_${stamp(this.#beginMs + this.#next * 1000)}.wav`;
      // Some loggers write under another name first.
      const path = join(this.site.drop, name);
      writeFileSync(`${path}.part`, wav(levels, this.#next + 1));
      renameSync(`${path}.part`, path);
      this.names.push(name);
    }
    this.#next++;
  }

  /** A command in this process, beside the service in its own, while recordings go on coming. */
  command(...args: string[]): Promise<Said> {
    this.pour();
    return this.#command(args);
  }

  async #command(args: readonly string[]): Promise<Said> {
    const out: string[] = [];
    const err: string[] = [];
    const begunMs = performance.now();
    const status = await main(args, {
      out: { write: (text: string) => out.push(text) },
      err: { write: (text: string) => err.push(text) },
      workingFolder: this.site.folder,
    } as never);
    this.slowestMs = Math.max(this.slowestMs, performance.now() - begunMs);
    return { status, out: out.join(''), err: err.join('') };
  }

  /** Asks by a command until the answer is there; each question takes its time, and recordings go on. */
  async until(what: string, args: string[], holds: (said: Said) => boolean): Promise<Said> {
    for (let asked = 0; asked < 3000; asked++) {
      if (asked % 50 === 0) this.pour();
      const said = await this.#command(args);
      if (holds(said)) return said;
      // The mail server and the log of the service live in this process too.
      await setImmediate();
    }
    throw new Error(`${what} never came`);
  }
}

it('acknowledge, note, journal, trend, status, files, take again, backup, reload while recordings pour in', async () => {
  const server = await MailServerOnLoopback.start();
  const site = makeSite({ mailPort: server.port, recordings: 'settle: 1 s' });
  onTestFinished(() => site.remove());
  const b = new Beside(site);
  writeFileSync(join(site.drop, 'pump-2_broken.wav'), 'RIFF but no recording at all');
  await once(b.child.stdout as NodeJS.ReadableStream, 'data');

  const dangerIn = ({ out }: Said) =>
    (JSON.parse(out) as { number: number; severity: string }[]).find(({ severity }) => severity === 'danger');
  const standing = await b.until('an alarm', ['alarms', '--json'], (said) => dangerIn(said) !== undefined);
  const number = String(dangerIn(standing)?.number);
  expect(
    await b.command('alarms', 'acknowledge', number, '--by', 'A. Fitter', '--comment', 'seen'),
  ).toMatchObject({
    status: 0,
    err: '',
  });
  expect((await b.command('alarms', 'acknowledge', number, '--by', 'B. Fitter')).err).toContain('A. Fitter');
  expect((await b.command('alarms', '--journal')).out).toContain('A. Fitter');
  expect(await b.command('trend', 'pump-2/de-v', 'overall')).toMatchObject({ status: 0, err: '' });
  expect(await b.command('status')).toMatchObject({ status: 0 });

  const files = await b.until('the quarantine', ['files', '--json'], ({ out }) => {
    const listed = JSON.parse(out) as { quarantine: unknown[] };
    return listed.quarantine.length > 0;
  });
  expect(files.out).toContain('pump-2_broken.wav');
  expect(await b.command('files', '--take-again', 'pump-2_broken.wav')).toMatchObject({ status: 0 });

  const noted = await b.command('note', 'pump-2', 'lubricated', '--by', 'A. Fitter', '--comment', 'greased');
  expect(noted).toMatchObject({ status: 0, err: '' });
  expect((await b.command('alarms', '--journal')).out).toContain('greased');

  const copy = join(site.folder, 'backup.sqlite');
  const takenBefore = counted(site, "outcome = 'taken'");
  expect(await b.command('backup', copy)).toMatchObject({ status: 0, err: '' });

  const text = readFileSync(join(site.folder, 'site.yaml'), 'utf8');
  writeFileSync(join(site.folder, 'site.yaml'), text.replace('name: Pump 2', 'name: Feed pump 2'));
  b.child.kill('SIGHUP');
  await b.until('the new site file', ['status', '--json'], () =>
    b.log.some(({ msg }) => msg === 'site file in force'),
  );
  writeFileSync(join(site.folder, 'site.yaml'), text.replace('unit: m/s2', 'unit: parsecs'));
  b.child.kill('SIGHUP');
  await b.until('the refusal', ['summary'], () =>
    b.log.some(({ msg }) => msg === 'the site file stays as it was'),
  );
  writeFileSync(join(site.folder, 'site.yaml'), text);

  const all = b.names.length;
  await b.until('the last recording', ['status'], () => counted(site, "outcome = 'taken'") >= all + 10);
  b.child.kill('SIGTERM');
  const [code] = await once(b.child, 'exit');
  expect(code).toBe(0);

  const taken = rows(site, "select file_name from recordings where outcome = 'taken'").map(
    (row) => row.file_name,
  );
  expect(new Set(taken).size).toBe(taken.length);
  const left = filesBelow(site.drop);
  expect([...taken, ...left].sort()).toEqual([...b.names].sort());
  expect(
    filesBelow(join(site.data, 'archive'))
      .map((path) => path.split('/').at(-1))
      .sort(),
  ).toEqual([...taken].sort());
  expect(rows(site, "select reason from recordings where outcome = 'quarantined'")).toHaveLength(2);
  expect(rows(site, "select actor from journal where event = 'acknowledged' and actor <> 'service'")).toEqual(
    [{ actor: 'A. Fitter' }],
  );
  expect(readFileSync(join(site.data, 'acts.log'), 'utf8').split('\n')).toHaveLength(3);
  const backup = new Database(copy, { readonly: true });
  expect(backup.pragma('integrity_check', { simple: true })).toBe('ok');
  expect(
    backup.prepare("select count(*) from recordings where outcome = 'taken'").pluck().get(),
  ).toBeGreaterThanOrEqual(takenBefore);
  backup.close();
  expect(
    b.log.filter(({ level, msg }) => level === 'error' && !msg.startsWith('the site file stays')),
  ).toEqual([]);
  expect(b.slowestMs).toBeLessThan(longestCommandMs);
}, 180_000);

function rows(site: SiteOnDisk, query: string): Record<string, unknown>[] {
  const ledger = new Database(join(site.data, 'ledger.sqlite'), { readonly: true });
  try {
    return ledger.prepare(query).all() as Record<string, unknown>[];
  } finally {
    ledger.close();
  }
}

function counted(site: SiteOnDisk, where: string): number {
  return rows(site, `select count(*) as n from recordings where ${where}`)[0]?.n as number;
}
