/** Short recordings that are averaged together, from the drop folder to the alarm. */
import { describe, expect, it } from 'vitest';
import { newestMeasurement } from '../../src/store/read-measurements.ts';
import {
  beginMs,
  fullScale,
  hourMs,
  type SiteChanges,
  signal,
  stamp,
  type TrialService,
  wav,
} from './site-on-disk.ts';
import { serviceOn, site, trial } from './trial.ts';

const three: SiteChanges = {
  recordings: 'overdue_after: 5 h',
  pump: 'running: sidecar\nanalysis:\n  line_spacing: 10 Hz\n  average_over: 3 recordings',
};
const at = (hour: number, ending = 'wav') => `pump-2_${stamp(beginMs + hour * hourMs)}.${ending}`;

async function hour(
  service: TrialService,
  n: number,
  what: number | Float64Array,
  sidecar: string | null = '{"running": true}',
): Promise<void> {
  service.toHour(n);
  if (sidecar !== null) service.drop(at(n, 'json'), sidecar);
  service.drop(at(n), wav([what], n + 1));
  await service.take();
}

interface Level {
  readonly hour: number;
  readonly level: number;
  readonly inTrend: boolean;
}

async function levels(service: TrialService): Promise<Level[]> {
  const rows = await service.rows('levels', 'used_ms, level, in_trend', 'order by used_ms');
  return rows.map(({ used_ms, level, in_trend }) => ({
    hour: (Number(used_ms) - beginMs) / hourMs,
    level: Number(level),
    inTrend: in_trend === 1,
  }));
}

/** Alarms of the pump; nothing comes from the press, which is overdue soon. */
const alarms = async (service: TrialService) =>
  (await service.standing()).filter((one) => one.includes('pump-2'));

const openPools = (service: TrialService) =>
  service
    .rows('open_pools', 'recordings, newest_used_ms')
    .then((rows) => rows.map(({ recordings }) => recordings));

function clipped(): Float64Array {
  return signal(9, 7).map((value) => Math.max(-5, Math.min(5, value)) * (fullScale / 5));
}

describe('three recordings averaged together', () => {
  it('give one level, at the time of the newest, of all their segments', async () => {
    const service = await trial(three);
    for (const [n, level] of [1, 2, 2.5].entries()) {
      await hour(service, n, level);
      expect((await levels(service)).length).toBe(n === 2 ? 1 : 0);
      expect(await openPools(service)).toEqual(n === 2 ? [] : [n + 1]);
    }
    const [level] = await levels(service);
    expect(level).toMatchObject({ hour: 2, inTrend: true });
    // Mean square of 1, 2 and 2.5 m/s² r.m.s.
    expect(level.level).toBeCloseTo(Math.sqrt((1 + 4 + 6.25) / 3), 1);
    const rows = await service.rows('measurements', 'averages, pooled_recordings, rms', 'order by used_ms');
    // 0.5 s in segments of 0.1 s at 50 % overlap: 9 segments each.
    expect(rows.map(({ averages, pooled_recordings }) => [averages, pooled_recordings])).toEqual([
      [null, null],
      [null, null],
      [27, 3],
    ]);
    expect(rows.every(({ rms }) => Number(rms) > 0.9)).toBe(true);
    expect(await service.rows('spectra', 'used_ms')).toHaveLength(1);
  });

  it('leave the newest levels of the point in sight while the next recordings wait', async () => {
    const service = await trial(three);
    for (let n = 0; n < 5; n++) await hour(service, n, 1);
    const [{ point_id }] = await service.rows('levels', 'point_id');
    const newest = (only: { readonly waiting?: boolean }) =>
      service.service.ledger.read((reader) => newestMeasurement(reader, Number(point_id), only));
    expect(await newest({})).toMatchObject({ usedMs: beginMs + 2 * hourMs, averaging: { recordings: 3 } });
    expect(await newest({ waiting: true })).toMatchObject({ usedMs: beginMs + 4 * hourMs, averaging: null });
  });

  it('raise an alarm by the level of the pool, each pool counting as one for the on-delay', async () => {
    const service = await trial(three);
    const standing: string[][] = [];
    for (let n = 0; n < 9; n++) {
      await hour(service, n, n < 3 ? 1 : 4);
      standing.push(await alarms(service));
    }
    const alarm = 'overall-fixed-upper pump-2/de-v alert';
    expect(standing.map((one) => one.length)).toEqual([0, 0, 0, 0, 0, 0, 0, 0, 1]);
    expect(standing[8]).toEqual([alarm]);
    for (let n = 9; n < 12; n++) await hour(service, n, 1);
    expect(await alarms(service)).toEqual([]);
  });

  it('let a single knock of ten times the level raise nothing', async () => {
    const service = await trial(three);
    for (let n = 0; n < 9; n++) await hour(service, n, n === 4 ? 7 : 0.7);
    const [, knocked] = await levels(service);
    expect(knocked.level).toBeGreaterThan(3);
    expect(await alarms(service)).toEqual([]);
  });

  it('count a danger at once that one recording proves with its own segments', async () => {
    const service = await trial(three);
    await hour(service, 0, 1);
    await hour(service, 1, 9);
    expect(await alarms(service)).toEqual(['overall-fixed-upper pump-2/de-v danger']);
    expect(await openPools(service)).toEqual([2]);
    const [own] = await levels(service);
    expect(own).toMatchObject({ hour: 1, inTrend: false });
    await hour(service, 2, 1);
    // The pool of all three, 5.3 m/s², is an alert.
    expect(await alarms(service)).toEqual(['overall-fixed-upper pump-2/de-v alert']);
  });
});

describe('what stays out of a pool', () => {
  it('a flagged recording: held against the limits by itself, it raises and is no part of the trend', async () => {
    const service = await trial(three);
    await hour(service, 0, 1);
    for (const n of [1, 2]) await hour(service, n, clipped());
    expect(await openPools(service)).toEqual([1]);
    expect((await alarms(service)).filter((one) => one.includes('overall'))).toEqual([
      'overall-fixed-upper pump-2/de-v danger',
    ]);
    expect((await levels(service)).map(({ inTrend }) => inTrend)).toEqual([false, false]);
    for (const n of [3, 4]) await hour(service, n, 1);
    expect((await levels(service)).at(-1)).toMatchObject({ hour: 4, inTrend: true });
    expect((await levels(service)).at(-1)?.level).toBeCloseTo(1, 1);
  });

  it('a late recording: it enters no newer pool, and what it exceeds is told', async () => {
    const service = await trial(three);
    await hour(service, 0, 1);
    await hour(service, 2, 1);
    service.drop(at(1, 'json'), '{"running": true}');
    service.drop(at(1), wav([5], 40));
    await service.take();
    expect(await openPools(service)).toEqual([2]);
    expect(await service.journal()).toEqual(['started', 'exceeded-came-late']);
    await hour(service, 3, 1);
    expect((await levels(service)).at(-1)?.level).toBeCloseTo(1, 1);
  });
});

describe('a pool that ends early is judged as it stands', () => {
  it('when the machine stops', async () => {
    const service = await trial({ ...three, limit: 'off_delay: 1 recordings' });
    for (let n = 0; n < 5; n++) await hour(service, n, 4);
    await hour(service, 5, 0.01, '{"running": false}');
    expect(await openPools(service)).toEqual([]);
    expect((await levels(service)).filter(({ inTrend }) => inTrend)).toMatchObject([
      { hour: 2 },
      { hour: 4 },
    ]);
    const rows = await service.rows(
      'measurements',
      'averages',
      'where averages is not null order by used_ms',
    );
    expect(rows.slice(0, 2).map(({ averages }) => averages)).toEqual([27, 18]);
    expect(await alarms(service)).toEqual(['overall-fixed-upper pump-2/de-v alert']);
    const [raised] = await service.rows(
      'journal',
      'used_ms, recording_id',
      "where event = 'raised' and key like 'limit:%'",
    );
    expect(raised).toEqual({ used_ms: beginMs + 4 * hourMs, recording_id: 5 });
  });

  it('when nothing came for longer than its overdue span', async () => {
    const service = await trial(three);
    for (const n of [0, 1, 8]) await hour(service, n, 2);
    expect((await levels(service)).map((one) => one.hour)).toEqual([1]);
    expect(await openPools(service)).toEqual([1]);
  });

  it('but is dropped when its settings change, and when pooling is switched off', async () => {
    const on = site(three);
    const first = await serviceOn(on);
    for (const n of [0, 1]) await hour(first, n, 2);
    expect(await openPools(first)).toEqual([2]);
    await first.stop();
    const { writeFileSync, readFileSync } = await import('node:fs');
    const path = `${on.folder}/site.yaml`;
    writeFileSync(
      path,
      readFileSync(path, 'utf8').replace('  average_over: 3 recordings', '  overlap: 50 %'),
    );
    const { siteAt, TrialService: Trial } = await import('./site-on-disk.ts');
    const again = await Trial.start(siteAt(on.folder), { clock: first.clock });
    try {
      expect(await openPools(again)).toEqual([]);
      await hour(again, 2, 2);
      expect((await levels(again)).map((one) => one.hour)).toEqual([2]);
    } finally {
      await again.stop();
    }
  });
});

it('a pool goes on over a stop and a start of the service', async () => {
  const on = site(three);
  const first = await serviceOn(on);
  for (const n of [0, 1]) await hour(first, n, 2);
  await first.stop();
  const second = await serviceOn(on, { clock: first.clock });
  await hour(second, 2, 2);
  expect((await levels(second)).map((one) => one.hour)).toEqual([2]);
  const [row] = await second.rows('measurements', 'averages', 'where averages is not null');
  expect(row).toEqual({ averages: 27 });
});
