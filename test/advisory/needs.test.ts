/** What the morning's summary puts first, and what it says of a bearing with several alarms. */
import { describe, expect, it } from 'vitest';
import type { StandingAlarm } from '../../src/advisory/facts.ts';
import { morningOf, needsPerson } from '../../src/advisory/summary.ts';
import { alert, danger, summaryFacts } from './sample-facts.ts';

const needs = (standing: readonly StandingAlarm[]) =>
  morningOf({ ...summaryFacts, standing }).sections.find(({ name }) => name === 'needs')?.findings ?? [];
const nowMs = summaryFacts.writtenMs;

describe('needs a person today', () => {
  it('what the site file holds back, where it is a danger that nobody has seen', () => {
    const held = { ...danger, standing: 'suppressed', suppressedWhy: 'trouble of fan-3/de-v' } as const;
    expect(needsPerson(held, nowMs)).toBe(true);
    expect(needs([held])[0]?.since).toMatch(/suppressed by design: trouble of fan-3\/de-v\.$/);
    expect(needsPerson({ ...held, severity: 'alert' }, nowMs)).toBe(false);
    expect(needsPerson({ ...held, acknowledgedBy: 'K. Example', acknowledgedMs: nowMs - 1 }, nowMs)).toBe(
      false,
    );
    expect(needsPerson({ ...held, standing: 'shelved' }, nowMs)).toBe(false);
  });

  it('what rose to danger on its shelf, but not what was shelved as a danger', () => {
    const shelved = {
      ...danger,
      standing: 'shelved',
      suppressedBy: 'A. Fitter',
      suppressedWhy: 'tank cleaning',
    } as const;
    expect(needsPerson(shelved, nowMs)).toBe(false);
    expect(needs([{ ...shelved, untoldDanger: true }])[0]?.since).toMatch(
      /, rose to danger while shelved, by A\. Fitter: tank cleaning\.$/,
    );
  });

  it('begins with what stands, not with the danger that is over', () => {
    const over = { ...danger, number: 1, standing: 'returned-unacknowledged' } as const;
    const stands = { ...alert, number: 2, machine: danger.machine, point: danger.point };
    const [finding, ...rest] = needs([over, stands]);
    expect(rest).toEqual([]);
    expect(finding).toMatchObject({ number: 2, mark: 'alert' });
    expect(finding?.todo).not.toContain('back within its limit');
    expect(finding?.also.join(' ')).toMatch(/Also DANGER 1, .*; back to normal, unacknowledged/);
  });
});
