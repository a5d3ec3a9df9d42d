import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { QualityFlag } from '../../src/acquisition/recording.ts';
import type { Limit, Site } from '../../src/config/site.ts';
import type { WantedLimit } from '../../src/detection/wanted-limit.ts';
import { seededRandom } from '../signal/random.ts';
import { dayMs } from './mail-bench.ts';
import { beginMs, everyMs, type Heard, Plant, plantSite } from './rehearsed-plant.ts';

const seed = 20261201;

const upper = { alert: 0.0028, danger: 0.0045 };
/** Kinds of limits, each with its own band but for those that share one. */
const limits: readonly Partial<Limit>[] = [
  { bandId: 'a', ...upper, onDelay: { recordings: 2 } },
  { bandId: 'a', ...upper, onDelay: { recordings: 1 }, latching: true, deadbandPercent: 0 },
  { bandId: 'a', ...upper, onDelay: { ms: 2 * everyMs }, offDelay: { recordings: 3 }, confident: true },
  { bandId: 'a', alert: 0.0012, side: 'lower', onDelay: { recordings: 1 } },
  { bandId: 'b', alert: null, kind: 'statistical', rule: { by: 'spread', alert: 4.5, danger: 9 } },
  {
    bandId: 'b',
    alert: null,
    kind: 'baseline',
    rule: { by: 'baseline', alert: 1.5, danger: 2 },
    ceilings: { alert: { value: 0.0028, why: 'a table' }, danger: null },
    conditions: ['full'],
    onDelay: { recordings: 1 },
  },
  {
    bandId: 'b',
    alert: null,
    danger: 0.004,
    kind: 'statistical',
    onDelay: { recordings: 1 },
    rule: { by: 'spread', alert: 3, danger: null },
  },
  { bandId: 'b', alert: null, kind: 'change', rule: { by: 'change', alert: 0.0006 } },
  {
    bandId: 'c',
    alert: null,
    kind: 'rate',
    rule: { by: 'rate', overMs: 3 * dayMs, alert: 1.3, danger: 1.8 },
  },
  {
    bandId: 'c',
    alert: null,
    kind: 'curve',
    rule: {
      by: 'curve',
      over: 'speed',
      values: [
        { at: 20, alert: 0.002, danger: 0.004 },
        { at: 50, alert: 0.003, danger: null },
      ],
    },
  },
];

const machine = {
  running: { by: 'speed', aboveRpm: 300 },
  afterStartMs: everyMs,
  conditions: [
    { id: 'full', speedHz: { from: 40, to: 60 }, loadPercent: null },
    { id: 'part', speedHz: { from: 15, to: 30 }, loadPercent: null },
  ],
} as const;

interface Hour {
  readonly rpm: number;
  readonly factors: readonly number[];
  readonly flag: QualityFlag | null;
  readonly atLeast: boolean;
  readonly proves: boolean;
  readonly gap: number;
  readonly does: 'late' | 'repair' | null;
}

/** Mostly a quiet machine at full speed; every so often whatever can happen. */
function storyOf(seed: number): Hour[] {
  const random = seededRandom(seed);
  const now = (share: number) => random.uniform() < share;
  const oneOf = <T>(all: readonly T[]): T => all[Math.floor(random.uniform() * all.length)] as T;
  const between = (from: number, to: number) => from + (to - from) * random.uniform();
  return Array.from({ length: 250 }, () => ({
    rpm: now(0.2) ? oneOf([1500, 1200, 2000, 2000, 0]) : 2970,
    factors: [0, 1, 2].map(() => (now(0.15) ? between(0.3, 3) : between(0.9, 1.1))),
    flag: now(0.06) ? oneOf(['unsteady', 'clipped', 'speed-doubtful'] as const) : null,
    atLeast: now(0.06),
    proves: now(0.5),
    gap: now(0.05) ? Math.ceil(between(1, 30)) : 1,
    does: now(0.015) ? oneOf(['late', 'repair'] as const) : null,
  }));
}

function heard({ rpm, factors, flag, atLeast, proves, does }: Hour): Heard {
  const level = (factor: number) => ({ level: 0.0019 * factor, atLeast });
  const exceeded = proves ? { exceededBy80Percent: 0.0018 * (factors[0] ?? 1) } : {};
  const speed = {
    rpm,
    origin: 'sidecar',
    uncertaintyRpm: 1,
    usableForNames: true,
    rangeRpm: null,
    inSpectrum: null,
  } as const;
  return {
    levels: {
      a: { ...level(factors[0] ?? 1), ...exceeded },
      b: level(factors[1] ?? 1),
      c: level(factors[2] ?? 1),
    },
    more: { speed, quality: flag === null ? [] : [{ flag, detail: 'as it came' }] },
    late: does === 'late',
  };
}

async function live(site: Site, story: readonly Hour[]): Promise<Plant> {
  const plant = await Plant.begin(site);
  let usedMs = beginMs;
  for (const one of story) {
    usedMs += one.gap * everyMs;
    if (one.does === 'repair') await plant.repair(usedMs - everyMs / 2);
    await plant.hear(usedMs, heard(one));
  }
  return plant;
}

describe('the site file in force, rehearsed', () => {
  it('gives the alarms that came, at the same times and as long, whatever was heard (random stories)', async () => {
    let alarms = 0;
    let kinds = new Set<string>();
    await fc.assert(
      fc.asyncProperty(fc.integer({ min: 1, max: 1e9 }), async (story) => {
        const plant = await live(plantSite(limits, machine), storyOf(story));
        const { limits: rehearsed } = await plant.rehearsed();
        expect(rehearsed).toHaveLength(limits.length);
        for (const { limit, rehearsal, came } of rehearsed) {
          const plain = rehearsal.alarms.map(({ told, ...alarm }) => alarm);
          expect({ limit: limit.id, alarms: plain }).toEqual({
            limit: limit.id,
            alarms: came.map(({ key, ...alarm }) => alarm),
          });
          alarms += came.length;
          if (came.length > 0) kinds = kinds.add(limit.kind);
        }
        expect(await tellings(plant)).toEqual(
          rehearsed
            .flatMap(({ rehearsal }) =>
              rehearsal.alarms.flatMap(({ told }) => told.map(({ usedMs }) => usedMs)),
            )
            .sort((a, b) => a - b),
        );
        await plant.ledger.close();
      }),
      { seed, numRuns: 5, endOnFailure: true },
    );
    expect(alarms).toBeGreaterThan(200);
    expect([...kinds].sort()).toEqual(['baseline', 'change', 'curve', 'fixed', 'rate', 'statistical']);
  }, 120_000);
});

/** Levels of band `a` in turn, one a recording, at full speed. */
async function heardInTurn(plant: Plant, factors: readonly number[], fromMs = beginMs): Promise<number> {
  let usedMs = fromMs;
  for (const factor of factors) {
    await plant.hear(usedMs, { levels: { a: { level: 0.002 * factor } } });
    usedMs += everyMs;
  }
  return usedMs;
}

const quick = { bandId: 'a', onDelay: { recordings: 1 }, deadbandPercent: 0 } as const;

describe('a site file that is not in force', () => {
  it('gives the alarms of its own limits, beside those that came of the old ones', async () => {
    const plant = await Plant.begin(
      plantSite([
        { ...quick, alert: 0.005 },
        { ...quick, alert: 0.0028 },
      ]),
    );
    await heardInTurn(plant, [1, 3, 1, 1, 1.5, 1, 1]);
    const candidate = plantSite([{ ...quick, alert: 0.0028 }]);
    const { limits: rehearsed, gone } = await plant.rehearsed(candidate);
    expect(rehearsed.map(({ inTime, came }) => [inTime.count, came.length])).toEqual([[2, 1]]);
    expect([...gone].map(([key, alarms]) => [key, alarms.length])).toEqual([['limit:pump/de/a/limit-1', 2]]);
    expect(rehearsed[0]?.inTime).toMatchObject({ inAlarmMs: 2 * everyMs, longestMs: everyMs, stands: false });
    await plant.ledger.close();
  });

  it('counts what comes and goes as chattering, and tells people of it once', async () => {
    const plant = await Plant.begin(plantSite([{ ...quick, alert: 1 }]));
    await heardInTurn(
      plant,
      Array.from({ length: 40 }, (_, n) => (n % 3 === 1 ? 2 : 1)),
    );
    const { limits: rehearsed, people } = await plant.rehearsed(plantSite([quick]));
    expect(rehearsed[0]?.inTime).toMatchObject({ count: 13, chattering: 10 });
    // Three that came and went, and the fourth as chattering.
    expect(people.map(({ told }) => told)).toEqual([4, 0]);
    await plant.ledger.close();
  });

  it('counts for each person what it would have been told, and the busiest week', async () => {
    const plant = await Plant.begin(plantSite([{ ...quick, alert: 1 }]));
    const quiet = Array.from({ length: 30 }, () => 1);
    await heardInTurn(plant, [2, ...quiet, ...quiet, 3, ...quiet, 2, ...quiet]);
    const { people } = await plant.rehearsed(plantSite([{ ...quick, danger: 0.0045 }]));
    expect(people).toEqual([
      { address: 'ann@larkfen.example', told: 3, busiest: { fromMs: beginMs + 7 * dayMs, told: 2 } },
      { address: 'ben@larkfen.example', told: 1, busiest: { fromMs: beginMs + 7 * dayMs, told: 1 } },
    ]);
    await plant.ledger.close();
  });

  it('names bands that the ledger has no levels of', async () => {
    const plant = await Plant.begin(plantSite([quick]));
    await heardInTurn(plant, [1, 2]);
    const { limits: rehearsed, cannot } = await plant.rehearsed(plantSite([quick, { bandId: 'new' }]));
    expect(rehearsed).toHaveLength(1);
    expect(cannot.map(({ band, why }) => [band.id, why])).toEqual([['new', 'the ledger has no level of it']]);
    await plant.ledger.close();
  });

  it('takes an alarm that stood before the time asked for as standing, not as new', async () => {
    const plant = await Plant.begin(plantSite([quick]));
    const endMs = await heardInTurn(plant, [1, 2, 2, 2, 2, 2, 2, 2, 1, 2, 1]);
    const { limits: rehearsed } = await plant.rehearsed(plantSite([quick]), { fromMs: endMs - 7 * everyMs });
    expect(rehearsed[0]?.inTime).toMatchObject({ count: 1, longestMs: 4 * everyMs, inAlarmMs: 5 * everyMs });
    await plant.ledger.close();
  });

  it('learns a baseline from the readings before the time asked for', async () => {
    const learned = {
      ...quick,
      alert: null,
      kind: 'baseline',
      rule: { by: 'baseline', alert: 1.5, danger: null },
    } as const;
    const plant = await Plant.begin(plantSite([quick]));
    const times = (count: number, factor: number) => Array.from({ length: count }, () => factor);
    // What is usual is 1, from the first three weeks: the time asked for and the fortnight before say 0.6.
    const endMs = await heardInTurn(plant, [...times(170, 1), ...times(130, 0.6), 1, 1.6, 1.6, 1]);
    const { limits: rehearsed } = await plant.rehearsed(plantSite([learned]), { fromMs: endMs - dayMs });
    expect(rehearsed[0]?.inTime).toMatchObject({ count: 1, inAlarmMs: 2 * everyMs });
    await plant.ledger.close();
  });
});

describe('the limit that would have come as often as wanted', () => {
  const wanted = { times: 1, per: 'week' } as const;
  const kinds: readonly Partial<Limit>[] = [
    { alert: 0.0021, danger: null },
    { alert: 0.0021, danger: 0.05 },
    { alert: 0.02, danger: null },
    { alert: 0.0019, side: 'lower' },
    { alert: null, kind: 'statistical', rule: { by: 'spread', alert: 0.5, danger: null } },
    { alert: null, kind: 'baseline', rule: { by: 'baseline', alert: 1.05, danger: null } },
    { alert: null, kind: 'change', rule: { by: 'change', alert: 0.0001 } },
  ];

  it.each(kinds)('comes no more often when it is rehearsed again: %j', async (kind) => {
    const plant = await Plant.begin(plantSite([{ ...quick, alert: 1 }]));
    const random = seededRandom(seed);
    await heardInTurn(
      plant,
      Array.from({ length: 300 }, () => Math.exp(0.15 * random.gaussian())),
    );
    const site = plantSite([{ ...quick, ...kind }]);
    const rehearsal = await plant.rehearsed(site, { wanted });
    const [one] = rehearsal.limits;
    const suggestion = one?.wanted;
    if (one === undefined || suggestion?.value == null) throw new Error('nothing is suggested');
    const most = Math.floor((rehearsal.toMs - rehearsal.fromMs) / (7 * dayMs));
    const again = await plant.rehearsed(plantSite([withValue(one.limit, suggestion)]));
    expect(again.limits[0]?.inTime.count).toBe(suggestion.count);
    expect(suggestion.count).toBeLessThanOrEqual(most);
    const isTighter = one.inTime.count <= most;
    if (!isTighter) expect(one.inTime.count).toBeGreaterThan(most);
    // A step of 5 % back, and it would come too often, or stand for most of the time.
    const back = await plant.rehearsed(
      plantSite([withValue(one.limit, suggestion, isTighter ? 1.15 : 1.06)]),
    );
    const { count = 0, inAlarmMs = 0 } = back.limits[0]?.inTime ?? {};
    expect(count > most || inAlarmMs > 0.02 * (rehearsal.toMs - rehearsal.fromMs)).toBe(true);
    await plant.ledger.close();
  });

  it('says so where no value would do', async () => {
    const plant = await Plant.begin(plantSite([{ ...quick, alert: 1 }]));
    await heardInTurn(
      plant,
      Array.from({ length: 90 }, (_, n) => (n % 5 === 1 ? 2 : 1)),
    );
    const site = plantSite([{ ...quick, danger: 0.0029 }]);
    const [one] = (await plant.rehearsed(site, { wanted })).limits;
    expect(one?.wanted).toMatchObject({ moves: 'alert', value: null, count: null });
    await plant.ledger.close();
  });
});

/** The limit with the suggested value, or one that is so much tighter. */
function withValue(limit: Limit, { moves, value }: WantedLimit, tighter = 1): Limit {
  if (value === null) throw new Error('no value');
  const { rule } = limit;
  if (moves === 'alert' || moves === 'danger')
    return { ...limit, [moves]: limit.side === 'upper' ? value / tighter : value * tighter };
  if (rule?.by === 'baseline') return { ...limit, rule: { ...rule, alert: 1 + (value - 1) / tighter } };
  if (rule?.by === 'spread' || rule?.by === 'change')
    return { ...limit, rule: { ...rule, alert: value / tighter } };
  throw new Error(`a limit without ${moves}`);
}

async function tellings({ ledger }: Plant): Promise<number[]> {
  const rows = await ledger.read((reader) =>
    reader
      .selectFrom('to_tell')
      .innerJoin('journal', 'journal.sequence', 'to_tell.journal_sequence')
      .select('to_tell.wall_ms')
      .where('to_tell.key', 'like', 'limit:%')
      .where('to_tell.event', '!=', 'exceeded-came-late')
      .orderBy('to_tell.wall_ms')
      .execute(),
  );
  return rows.map((row) => row.wall_ms);
}
