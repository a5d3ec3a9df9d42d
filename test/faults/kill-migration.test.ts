/**
 * A newer program finds an older ledger, and is killed at every step of bringing it up to date: the next start ends where
 * an undisturbed one ends, and the copy of the older ledger is whole.
 */
import { existsSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { noStep, type StepName } from '../../src/service/steps.ts';
import { openingSteps } from '../../src/store/ledger-steps.ts';
import { ledgerVersion } from '../../src/store/migrations/index.ts';
import { playInChild } from './killed.ts';
import { hoursThen, newerMigrations, olderStory } from './older-ledger.ts';
import { playStory } from './story.ts';
import type { StoryRun } from './story-run.ts';

const migrations = newerMigrations;
const copyOf = (run: StoryRun) => join(run.data, 'ledger-before-2.sqlite');

/** Everything in a ledger, table by table, but when its migrations were done. */
function contentOf(path: string): Record<string, unknown> {
  const ledger = new Database(path, { readonly: true });
  try {
    expect(ledger.pragma('quick_check', { simple: true })).toBe('ok');
    const tables = ledger
      .prepare("select name from sqlite_master where type = 'table' order by name")
      .pluck()
      .all() as string[];
    return {
      version: ledgerVersion(ledger),
      ...Object.fromEntries(
        tables.map((table) => {
          const columns = table === 'migrations' ? 'number, name' : '*';
          return [table, ledger.prepare(`select ${columns} from ${table} order by 1, 2`).all()];
        }),
      ),
    };
  } finally {
    ledger.close();
  }
}

function whatTheNewestAdds(run: StoryRun): unknown {
  const { levels, levels_a_day, version, migrations: done } = contentOf(join(run.data, 'ledger.sqlite'));
  const decibels = (levels as Record<string, unknown>[])
    .map(({ point_id, used_ms, level, level_db }) => ({ point_id, used_ms, level, level_db }))
    .sort((a, b) => JSON.stringify(a).localeCompare(JSON.stringify(b)));
  return { decibels, levels_a_day, version, done };
}

/** Steps of a migration in the first and in the last one. */
const interruptions = openingSteps.flatMap((step) => {
  const times = step.startsWith('migration') ? new Set([1, migrations.length - 1]) : [1];
  return [...times].map((n) => ({ step, n }));
});

let played: ReturnType<typeof playUndisturbed> | null = null;

function undisturbed() {
  played ??= playUndisturbed();
  return played;
}

async function playUndisturbed() {
  const run = await olderStory();
  const kept = contentOf(join(run.data, 'ledger.sqlite'));
  const steps = new Map<StepName, number>();
  await playStory(run.folder, (name) => void steps.set(name, (steps.get(name) ?? 0) + 1), { migrations });
  return { kept, steps, state: run.state(), added: whatTheNewestAdds(run) };
}

describe('a newer program that finds an older ledger', () => {
  it('copies it, brings it up to date and goes on with its alarms and mails', async () => {
    const { kept, steps, state, added } = await undisturbed();
    expect(kept.version).toBe(1);
    for (const name of openingSteps)
      expect(steps.get(name), name).toBe(name.startsWith('migration') ? migrations.length - 1 : 1);
    expect(state.ledger.recordings).toHaveLength(9);
    expect(state.ledger.lives).toMatchObject([
      { key: expect.stringContaining('unreadable') },
      { key: expect.stringContaining('unassigned') },
      { key: expect.stringContaining('press-1/de-h/overall'), severity: 'danger' },
    ]);
    // What waited in the older ledger reached the server: the first start's mails and the quarantined file's.
    expect(state.mails.length).toBeGreaterThan(3);
    expect(added).toMatchObject({
      version: migrations.length,
      levels_a_day: [{ levels: 2 }, { levels: 2 }, { levels: 1 }],
    });
  });

  it.each(interruptions)(
    'is killed at "$step" ($n): the next start ends where an undisturbed one ends',
    async ({ step, n }) => {
      const whole = await undisturbed();
      const run = await olderStory();
      expect(await playInChild(run.folder, step, n, 'newer')).toMatchObject({ signal: 'SIGKILL', said: '' });
      // Whatever is called a copy is a whole one.
      if (existsSync(copyOf(run))) expect(contentOf(copyOf(run))).toEqual(whole.kept);
      await playStory(run.folder, noStep, { migrations });
      expect(run.state()).toEqual(whole.state);
      expect(whatTheNewestAdds(run)).toEqual(whole.added);
      expect(contentOf(copyOf(run))).toEqual(whole.kept);
      expect(readdirSync(run.data).filter((name) => name.includes('.part'))).toEqual([]);
      expect(new Set(run.received()).size).toBe(run.received().length);
    },
  );

  it('finds half a copy of a start that was killed while it copied, and does not take it for a whole one', async () => {
    const run = await olderStory();
    const ledger = join(run.data, 'ledger.sqlite');
    const kept = contentOf(ledger);
    const bytes = readFileSync(ledger);
    writeFileSync(`${copyOf(run)}.part`, bytes.subarray(0, bytes.length / 2));
    writeFileSync(`${copyOf(run)}.part-journal`, bytes.subarray(0, 512));
    await playStory(run.folder, noStep, { migrations, until: hoursThen });
    expect(contentOf(copyOf(run))).toEqual(kept);
    expect(readdirSync(run.data).filter((name) => name.includes('.part'))).toEqual([]);
  });
});
