import { describe, expect, it } from 'vitest';
import { alarmDetails } from '../../src/advisory/alarm-details.ts';
import type { LimitFacts } from '../../src/advisory/facts.ts';
import { reasonsText } from '../../src/advisory/limit-words.ts';
import { largestShare, shareOfAlert } from '../../src/advisory/ranking.ts';
import type { BaselineNow, PointNow, SummaryFacts } from '../../src/advisory/summary-facts.ts';
import { learnedLines } from '../../src/advisory/summary-limits.ts';
import { summaryMail } from '../../src/advisory/summary-mail.ts';
import {
  bearing,
  blower,
  danger,
  day,
  driveH,
  driveV,
  levelOf,
  morning,
  overall,
  overallLimit,
  site,
  summaryFacts,
} from './sample-facts.ts';

const learned: LimitFacts = {
  ...overallLimit,
  reasons: { alert: '4.5 spreads of 11 % above 1.8 mm/s, the median of 12 running days', danger: null },
};
const rows = (parts: object) =>
  new Map(alarmDetails({ ...danger, ...parts }, site.timeZone, morning).map(([name, said]) => [name, said]));

describe('why a limit stands where it stands', () => {
  it('is said with what it was learned from, and who stands for that', () => {
    expect(reasonsText(overallLimit)).toBeNull();
    const why = 'alert at 4.5 spreads of 11 % above 1.8 mm/s, the median of 12 running days';
    expect(reasonsText(learned)).toBe(why);
    expect(reasonsText({ ...learned, provisional: true })).toBe(`${why}; provisional baseline`);
    expect(reasonsText({ ...learned, confirmedBy: 'M. Example' })).toBe(
      `${why}; baseline confirmed by M. Example`,
    );
    expect(reasonsText({ ...learned, unknown: 'no baseline yet: 3 of 7 running days' })).toBe(
      'not reckoned now: no baseline yet: 3 of 7 running days',
    );
  });

  it('of a rate is told by its line, which share and distance follow too', () => {
    const rate: LimitFacts = { ...overallLimit, danger: null, compared: 2.1e-3 };
    expect(shareOfAlert(5e-3, rate)).toBeCloseTo(0.75, 9);
    expect(largestShare(5e-3, [rate, { ...overallLimit, alert: 4e-3 }])).toBeCloseTo(1.25, 9);
    expect(rows({ severity: 'alert', limit: rate }).get('Limit')).toBe(
      'its line now 2.1 mm/s r.m.s.; alert 2.8 mm/s r.m.s.: 25 % under; no danger limit',
    );
  });
});

describe('levels before an alarm', () => {
  const none = { last: [], dayBefore: null, weekBefore: null, baseline: null };

  it('say from when on they are, after a repair or with another sensor', () => {
    const broken = { kind: 'repair', atMs: morning - 3 * day } as const;
    expect(rows({ before: { ...none, broken } }).get('Before')).toBe(
      'no earlier level since the repair of Sat 28 Nov 2026, 06:30',
    );
    const last = [{ usedMs: morning - day, level: 1.2e-3 }];
    expect(
      rows({ before: { ...none, last, broken: { ...broken, kind: 'sensor-changed' } } }).get('Before'),
    ).toBe(
      '1.2 mm/s r.m.s. (the last 1, newest first); nothing from before the change of sensor of Sat 28 Nov 2026, 06:30',
    );
  });
});

describe('learned limits in the summary', () => {
  const why = 'no baseline yet: 3 of 7 running days';
  const baseline: BaselineNow = {
    condition: '',
    state: 'learned',
    runningDays: 40,
    refused: null,
    confirmedBy: null,
  };
  const at = (
    point: PointNow['point'],
    limits: readonly LimitFacts[],
    baselines: readonly BaselineNow[],
    judging: PointNow['judging'] = 'judged',
  ): PointNow => ({
    machine: blower,
    point,
    judging,
    lastMs: morning,
    bands: [
      {
        band: point === driveH ? overall : bearing,
        level: levelOf(1e-3),
        limits,
        change: null,
        zone: null,
        baselines,
      },
    ],
  });
  const lines = (...points: PointNow[]) => learnedLines({ ...summaryFacts, points } as SummaryFacts);
  const unknown = { ...overallLimit, alert: null, danger: null, unknown: why };

  it('are passed over where all is learned, and where a person took the point out of service', () => {
    expect(lines(at(driveH, [learned], [baseline]))).toEqual([]);
    expect(lines(at(driveH, [unknown], [], 'out-of-service'))).toEqual([]);
  });

  it('name what is not judged and why; a band with another limit that stands is judged', () => {
    expect(lines(at(driveH, [unknown], []), at(driveV, [unknown, overallLimit], []))).toEqual([
      `1 band not judged, ${why}: Aeration blower 1, drive end, horizontal (overall).`,
    ]);
  });

  it('name baselines that are provisional, refused, or stand by a person', () => {
    const said = lines(
      at(driveH, [learned], [{ ...baseline, state: 'provisional', runningDays: 12 }]),
      at(
        driveV,
        [learned],
        [
          { ...baseline, condition: 'full', state: 'refused', refused: 'it lies in zone C or D' },
          { ...baseline, condition: 'part', confirmedBy: 'M. Example' },
        ],
      ),
    );
    expect(said).toEqual([
      'Provisional baselines: 1, 12 of 30 running days: Aeration blower 1, drive end, horizontal (overall).',
      "Baselines refused, no limit is reckoned from them: Aeration blower 1, drive end, vertical (bearing, full): it lies in zone C or D. See 'humledger baseline blower-1'; confirm, or have it learned again.",
      'Baseline confirmed by M. Example: Aeration blower 1, drive end, vertical (bearing, part).',
    ]);
  });

  it('stand as not reckoned in the table, where a band without limits has none', () => {
    const facts = { ...summaryFacts, points: [at(driveH, [unknown], []), at(driveV, [], [])] };
    const table = summaryMail(facts as SummaryFacts).text.split('\n');
    expect(table.find((line) => line.includes('horizontal, overall'))).toMatch(/not reckoned +not reckoned/);
    expect(table.find((line) => line.includes('vertical, bearing'))).toMatch(/none +none/);
  });

  it('of a whole site that is new take a line a reason, not a line a band', () => {
    const many = Array.from({ length: 40 }, (_, n) => at({ ...driveH, id: `p${n}` }, [unknown], []));
    const [first = '', ...others] = lines(...many);
    expect(others).toEqual([]);
    expect(first).toMatch(/^40 bands not judged, no baseline yet.*; and 37 more\.$/);
    expect(first.length).toBeLessThan(300);
  });
});
