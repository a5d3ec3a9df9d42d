/** A ledger whose file was overwritten in the middle: said or refused, with what to do; no recording is lost over it. */
import { copyFileSync, cpSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { SteppedClock } from '../../src/service/clock.ts';
import { orDamage } from '../../src/service/damage.ts';
import { createLog } from '../../src/service/log.ts';
import { Service } from '../../src/service/service.ts';
import { dice } from '../acquisition/spoilt-recordings.ts';
import {
  beginMs,
  filesBelow,
  hourMs,
  type SiteOnDisk,
  stamp,
  TrialService,
  wav,
} from '../service/site-on-disk.ts';
import { site } from '../service/trial.ts';

const seed = 20261201;
const pageBytes = 4096;
const whatToDo = /put the newest backup in its place/;

interface Damaged {
  readonly on: SiteOnDisk;
  readonly ledger: string;
  readonly sound: string;
  readonly pages: number;
}

/** Four hours of a service that was then killed, everything in the ledger's file; and a copy of all of it. */
async function killedSite(): Promise<Damaged> {
  const on = site();
  const service = await TrialService.start(on);
  for (let hour = 0; hour < 4; hour++) await service.hour(hour, { press: hour > 1 ? 5 : 1 });
  await service.service.ledger.checkpoint();
  const ledger = join(on.data, 'ledger.sqlite');
  const sound = join(on.folder, 'sound');
  cpSync(on.data, sound, { recursive: true });
  await service.stop();
  // The newest recording waits in the drop folder.
  writeFileSync(join(on.drop, `pump-2_${stamp(beginMs + 4 * hourMs)}.wav`), wav([1], 77));
  return { on, ledger, sound, pages: statSync(ledger).size / pageBytes };
}

function wholeCheck(ledger: string): unknown {
  const connection = new Database(ledger, { readonly: true });
  try {
    return connection.pragma('integrity_check(1)', { simple: true });
  } finally {
    connection.close();
  }
}

/** How one start on it went. */
async function oneStart({ on }: Damaged): Promise<string> {
  const lines: string[] = [];
  const ended = await orDamage(on.data, () => someRounds(on, lines));
  if (ended !== null) return ended.refused;
  return lines.filter((line) => /fails its check|is damaged/.test(line)).join('\n') || 'nothing said';
}

async function someRounds(on: SiteOnDisk, lines: string[]): Promise<{ readonly refused: string } | null> {
  const clock = new SteppedClock(beginMs + 4 * hourMs + 10_000);
  const log = createLog({ write: (line) => lines.push(line) });
  const service = await Service.start({ siteFile: on.siteFile, threads: 1, clock, log });
  if ('refused' in service) return service;
  try {
    for (let round = 0; round < 4; round++) {
      await service.intakeRound();
      await service.mailRound();
      clock.advance(6_000);
    }
    return null;
  } finally {
    await service.stop();
  }
}

describe('a ledger that was overwritten in the middle', () => {
  it('in any of its pages: every start ends in words, with what to do, and the recording that waits is kept', async () => {
    const damaged = await killedSite();
    const { on, ledger, sound, pages } = damaged;
    const d = dice(seed);
    const outcomes = { refused: 0, said: 0, unnoticed: 0 };
    const places = Array.from({ length: 16 }, (_, n) => Math.floor((n * pages) / 16));
    for (const page of places) {
      for (const ending of ['-wal', '-shm']) rmSync(`${ledger}${ending}`, { force: true });
      copyFileSync(join(sound, 'ledger.sqlite'), ledger);
      const bytes = readFileSync(ledger);
      const from = page * pageBytes + d.below(100);
      for (let n = 0; n < 3900; n++) bytes[from + n] = d.below(256);
      writeFileSync(ledger, bytes);
      const waits = filesBelow(on.drop);
      const said = await oneStart(damaged);
      // SQLite keeps no checksums: bytes changed in free space or inside a spectrum show nowhere, by no check.
      if (said === 'nothing said') {
        expect(wholeCheck(ledger), `page ${page}`).toBe('ok');
        outcomes.unnoticed++;
      }
      if (said !== 'nothing said') {
        expect(said, `page ${page}`).toMatch(whatToDo);
        if (said.includes('fails its check')) outcomes.said++;
        else outcomes.refused++;
      }
      const everywhere = [...filesBelow(on.drop), ...filesBelow(join(on.data, 'archive'))].join();
      for (const path of waits) expect(everywhere, `page ${page}`).toContain(path);
      // It is dropped again for the next page.
      const name = `pump-2_${stamp(beginMs + 4 * hourMs)}.wav`;
      rmSync(join(on.data, 'archive'), { recursive: true });
      rmSync(join(on.data, 'filings'), { recursive: true });
      cpSync(join(sound, 'archive'), join(on.data, 'archive'), { recursive: true });
      cpSync(join(sound, 'filings'), join(on.data, 'filings'), { recursive: true });
      writeFileSync(join(on.drop, name), wav([1], 77));
    }
    expect(outcomes.said).toBeGreaterThan(0);
    expect(outcomes.refused).toBeGreaterThan(0);
    expect(outcomes.said + outcomes.refused).toBeGreaterThan(5);
  }, 120_000);
});
