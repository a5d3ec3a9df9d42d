/** Shelves, places out of service, suppression by design and chattering, through the whole service with its own ledger. */

import { describe, expect, it } from 'vitest';
import { needsPerson } from '../../src/advisory/summary.ts';
import { actOnAlarm } from '../../src/service/acts-log.ts';
import { gatherSummary } from '../../src/service/summary-gather.ts';
import { beginMs, hourMs, stamp, type TrialService, wav } from './site-on-disk.ts';
import { serviceOn, site, trial } from './trial.ts';

const dayMs = 24 * hourMs;

/** Of pump-2's alarm: what was told, and what was journalled. */
async function told(t: TrialService): Promise<string[]> {
  const rows = await t.rows('to_tell', 'event, severity', "where key like 'limit:pump-2/%' order by id");
  return rows.map(({ event, severity }) => `${event} ${severity}`);
}

async function journalled(t: TrialService): Promise<string[]> {
  const rows = await t.rows('journal', 'event', "where key like 'limit:pump-2/%' order by sequence");
  return rows.map(({ event }) => String(event));
}

async function shelve(t: TrialService, forMs: number): Promise<void> {
  const person = { by: 'A. Fitter', via: 'command', wallMs: t.clock.wallMs() } as const;
  const order = { kind: 'shelve', comment: 'crane beside it', forMs, atMostMs: 7 * dayMs } as const;
  const answer = await actOnAlarm(t.service.ledger, 1, order, person);
  expect(answer).toMatchObject({ after: 'shelved' });
}

/** pump-2 sends, hour after hour; press-1 too, or its logger is silent. */
async function pumpHours(
  t: TrialService,
  from: number,
  levels: readonly number[],
  press = false,
): Promise<void> {
  for (const [n, pump] of levels.entries()) {
    const hour = from + n;
    if (press) await t.hour(hour, { pump });
    else {
      t.toHour(hour);
      t.drop(`pump-2_${stamp(beginMs + hour * hourMs)}.wav`, wav([pump], 10 * hour + 5));
      await t.take();
    }
  }
}

describe('suppression by design', () => {
  it('holds back what stands while another point is in trouble, and tells it when that is over', async () => {
    const t = await trial({ pump: 'suppressed_while:\n  - trouble of press-1/de-h' });
    await t.hour(0);
    await pumpHours(t, 1, [1, 1, 4, 4, 4]);
    expect(await journalled(t)).toEqual(['suppressed', 'raised']);
    expect(await told(t)).toEqual([]);
    await t.hour(6, { pump: 4 });
    expect(await journalled(t)).toEqual(['suppressed', 'raised', 'unsuppressed']);
    expect(await told(t)).toEqual(['unsuppressed alert']);
    // The trouble itself was told all the same.
    expect(await t.rows('to_tell', 'severity', "where key like 'trouble:overdue:press-1/de-h'")).toHaveLength(
      1,
    );
  });

  it('takes what stands already, and does not tell it again when nothing new happened', async () => {
    const t = await trial({ pump: 'suppressed_while:\n  - trouble of press-1' });
    for (const hour of [0, 1, 2]) await t.hour(hour, { pump: 4 });
    expect(await told(t)).toEqual(['raised alert']);
    await pumpHours(t, 3, [4, 4, 4, 4]);
    expect(await journalled(t)).toEqual(['raised', 'suppressed']);
    await t.hour(7, { pump: 4 });
    expect(await journalled(t)).toEqual(['raised', 'suppressed', 'unsuppressed']);
    expect(await told(t)).toEqual(['raised alert']);
  });

  it('follows the state of another machine, and holds nothing back for one that is silent', async () => {
    const t = await trial({
      press: 'running: level of overall above 0.5 m/s2',
      pump: 'suppressed_while: [press-1 stopped]',
    });
    await t.hour(0);
    for (const hour of [1, 2, 3, 4]) await t.hour(hour, { press: 0.05, pump: 4 });
    expect(await journalled(t)).toEqual(['suppressed', 'raised']);
    expect(await told(t)).toEqual([]);
    // Its logger falls silent: what it did when it was last heard of counts no more.
    await pumpHours(t, 5, [4, 4, 4, 4]);
    expect(await told(t)).toEqual(['unsuppressed alert']);
  });
});

describe('a shelf', () => {
  it('ends while the service is off, and is told at the next start', async () => {
    const on = site();
    const first = await serviceOn(on);
    for (const hour of [0, 1, 2]) await first.hour(hour, { pump: 4 });
    await shelve(first, 8 * hourMs);
    await first.stop();
    first.clock.advance(9 * hourMs);
    const second = await serviceOn(on, { clock: first.clock });
    await second.service.intakeRound();
    expect(await told(second)).toEqual(['raised alert', 'shelf-expired alert']);
  });

  it.each([-40 * dayMs, 40 * dayMs])(
    'lasts as long as it was meant to, when the clock is set by %d ms',
    async (byMs) => {
      const t = await trial();
      for (const hour of [0, 1, 2]) await t.hour(hour, { pump: 4 });
      await shelve(t, 8 * hourMs);
      t.clock.setWall(t.clock.wallMs() + byMs);
      await t.after(7 * hourMs);
      expect(await journalled(t)).toEqual(['raised', 'shelved']);
      await t.after(hourMs);
      expect(await journalled(t)).toEqual(['raised', 'shelved', 'shelf-expired']);
    },
  );

  it('is no hiding place for what rises to danger: the summary puts that among what needs a person', async () => {
    const t = await trial();
    const ofAlarm = async () => {
      const { ledger, view } = t.service;
      const { standing } = await gatherSummary({ ledger, view, nowMs: t.clock.wallMs(), upSinceMs: 0 });
      return standing.map((one) => [
        one.standing,
        one.untoldDanger ?? false,
        needsPerson(one, t.clock.wallMs()),
      ]);
    };
    for (const hour of [0, 1, 2]) await t.hour(hour, { pump: 4 });
    await shelve(t, 8 * hourMs);
    expect(await ofAlarm()).toEqual([['shelved', false, false]]);
    for (const hour of [3, 4]) await t.hour(hour, { pump: 12 });
    expect(await told(t)).toEqual(['raised alert']);
    expect(await ofAlarm()).toEqual([['shelved', true, true]]);
  });

  it('does not outlast its time when the clock was set back while the service was off', async () => {
    const on = site();
    const first = await serviceOn(on);
    for (const hour of [0, 1, 2]) await first.hour(hour, { pump: 4 });
    await shelve(first, 8 * hourMs);
    await first.stop();
    first.clock.setWall(beginMs - 40 * dayMs);
    const second = await serviceOn(on, { clock: first.clock });
    await second.service.intakeRound();
    await second.after(7 * hourMs);
    expect(await journalled(second)).toEqual(['raised', 'shelved']);
    await second.after(hourMs + 1);
    expect(await journalled(second)).toContain('shelf-expired');
  });

  it('has the next round come in time for its end', async () => {
    const t = await trial();
    for (const hour of [0, 1, 2]) await t.hour(hour, { pump: 4 });
    await shelve(t, 90_000);
    expect((await t.after(0)).againInMs).toBe(90_000);
    expect((await t.after(60_000)).againInMs).toBe(30_000);
    await t.after(30_000);
    expect(await journalled(t)).toContain('shelf-expired');
  });
});

describe('an alert that comes and goes', () => {
  /** Two recordings over the limit raise it, one below lets it return. */
  const cycle = [4, 4, 1];

  it('is told once as chattering, then held back until it stands or has calmed down; a danger is told', async () => {
    const t = await trial();
    await pumpHours(t, 0, [...cycle, ...cycle, ...cycle], true);
    expect(await told(t)).toEqual(['raised alert', 'raised alert', 'raised alert']);
    await pumpHours(t, 9, cycle, true);
    expect(await told(t)).toHaveLength(4);
    const [last] = await t.rows('journal', 'reason', "where event = 'raised' order by sequence desc limit 1");
    expect(JSON.parse(String(last.reason))).toMatchObject({ chattering: { returns: 3, recordings: 24 } });
    await pumpHours(t, 12, [...cycle, ...cycle], true);
    expect(await told(t)).toHaveLength(4);
    // A danger breaks out at once.
    await pumpHours(t, 18, [9, 9], true);
    expect((await told(t)).slice(4)).toEqual(['unsuppressed danger']);
  });

  it('is told when it has stopped coming and going and stands', async () => {
    const t = await trial();
    await pumpHours(t, 0, [...cycle, ...cycle, ...cycle, ...cycle], true);
    expect(await told(t)).toHaveLength(4);
    await pumpHours(
      t,
      12,
      Array.from({ length: 26 }, () => 4),
      true,
    );
    expect((await told(t)).slice(4)).toEqual(['unsuppressed alert']);
    expect((await journalled(t)).filter((event) => event === 'suppressed')).toHaveLength(1);
  }, 20_000);
});
