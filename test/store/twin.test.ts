import fc from 'fast-check';
import { expect, test } from 'vitest';
import type { AlarmState, AlarmSubject, Condition } from '../../src/detection/alarm.ts';
import { normalState, subjectKey } from '../../src/detection/alarm.ts';
import { loadAlarms, standingAlarms } from '../../src/store/alarms.ts';
import { readJournal } from '../../src/store/journal.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { newestMeasurement } from '../../src/store/read-measurements.ts';
import { readLevels } from '../../src/store/read-trends.ts';
import { findTaken, insertRecording } from '../../src/store/recordings.ts';
import { saveAlarmChange } from '../../src/store/save-alarm.ts';
import { type SiteIds, syncSite } from '../../src/store/site-ids.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

/**
 * The ledger against the plainest thing that could stand in for it: a few arrays. Both get the same random work, also
 * transactions that fail at their end and the ledger being closed and opened; after each both are read.
 */
const points = ['de', 'nde'] as const;
const bands = ['low', 'high'] as const;

type Work =
  | {
      readonly do: 'measure';
      readonly identity: number;
      readonly point: number;
      readonly usedMs: number;
      readonly levels: readonly number[];
      readonly fingerprint: number;
      readonly inTrend: boolean;
      readonly fails: boolean;
    }
  | { readonly do: 'alarm'; readonly point: number; readonly to: Condition; readonly fails: boolean }
  | { readonly do: 'reopen' };

const work: fc.Arbitrary<Work> = fc.oneof(
  {
    weight: 5,
    arbitrary: fc.record({
      do: fc.constant('measure' as const),
      identity: fc.integer({ min: 1, max: 12 }),
      point: fc.integer({ min: 0, max: 1 }),
      usedMs: fc.integer({ min: 1, max: 6 }),
      levels: fc.array(fc.double({ min: 0, max: 1, noNaN: true }), { minLength: 1, maxLength: 2 }),
      fingerprint: fc.integer({ min: 1, max: 2 }),
      inTrend: fc.boolean(),
      fails: fc.integer({ min: 0, max: 5 }).map((number) => number === 0),
    }),
  },
  {
    weight: 4,
    arbitrary: fc.record({
      do: fc.constant('alarm' as const),
      point: fc.integer({ min: 0, max: 1 }),
      to: fc.constantFrom('normal' as const, 'alert' as const, 'danger' as const),
      fails: fc.integer({ min: 0, max: 5 }).map((number) => number === 0),
    }),
  },
  { weight: 1, arbitrary: fc.constant({ do: 'reopen' as const }) },
);

interface TwinLevel {
  readonly point: string;
  readonly usedMs: number;
  readonly band: string;
  readonly fingerprint: string;
  readonly level: number;
  readonly inTrend: boolean;
  readonly measurement: number;
}

class Twin {
  readonly identities = new Set<string>();
  levels: readonly TwinLevel[] = [];
  readonly measurements: { readonly point: string; readonly usedMs: number }[] = [];
  readonly states = new Map<string, AlarmState>();
  lives: readonly {
    readonly number: number;
    readonly key: string;
    readonly severity: string;
    readonly ended: boolean;
  }[] = [];
  readonly journal: string[] = [];

  measure(of: Extract<Work, { do: 'measure' }>): void {
    const point = points[of.point] ?? '';
    this.identities.add(`${of.identity}`);
    this.measurements.push({ point, usedMs: of.usedMs });
    const measurement = this.measurements.length;
    for (const [index, level] of of.levels.entries()) {
      const row: TwinLevel = {
        point,
        usedMs: of.usedMs,
        band: bands[index] ?? '',
        fingerprint: `settings-${of.fingerprint}`,
        level,
        inTrend: of.inTrend,
        measurement,
      };
      const same = (other: TwinLevel) =>
        other.point === row.point &&
        other.usedMs === row.usedMs &&
        other.band === row.band &&
        other.fingerprint === row.fingerprint;
      const there = this.levels.find(same);
      if (there === undefined) this.levels = [...this.levels, row];
      else if (row.inTrend || !there.inTrend)
        this.levels = this.levels.map((other) => (same(other) ? row : other));
    }
  }

  alarm(key: string, state: AlarmState, event: string): void {
    const before = this.states.get(key)?.highest ?? null;
    if (before === null && state.highest !== null) {
      this.lives = [
        ...this.lives,
        { number: this.lives.length + 1, key, severity: state.highest, ended: false },
      ];
    } else if (before !== null) {
      this.lives = this.lives.map((life) =>
        life.key === key && !life.ended
          ? { ...life, severity: state.highest ?? before, ended: state.highest === null }
          : life,
      );
    }
    this.states.set(key, state);
    this.journal.push(`${key} ${event}`);
  }
}

function subjectOf(point: number): AlarmSubject {
  return {
    kind: 'limit',
    machineId: 'pump',
    pointId: points[point] ?? '',
    bandId: 'low',
    limitId: 'low-upper',
  };
}

function nextState(before: AlarmState, to: Condition): AlarmState {
  const version = before.version + 1;
  if (to === 'normal') return { ...normalState, version };
  const highest = before.highest === 'danger' ? 'danger' : to;
  return { ...before, condition: to, highest, sinceMs: 1, count: before.count + 1, usedMs: version, version };
}

/** Does the work on both; a transaction that fails reaches neither. */
async function perform(
  ledger: Ledger,
  ids: SiteIds,
  twin: Twin,
  of: Exclude<Work, { do: 'reopen' }>,
): Promise<void> {
  const failing = new Error('fails at its end');
  const transaction = ledger.transact(async (writer) => {
    let onTwin = (): void => {};
    if (of.do === 'measure') {
      if ((await findTaken(writer, `${of.identity}`)) !== null) return onTwin;
      const point = points[of.point] ?? '';
      const levels = Object.fromEntries(of.levels.map((level, index) => [bands[index] ?? '', level]));
      const plain = measurementOf('pump', point, levels);
      const recordingId = await insertRecording(
        writer,
        recordingOf({ identity: `${of.identity}`, usedMs: of.usedMs }),
      );
      await insertMeasurement(writer, ids, {
        measurement: {
          ...plain,
          levels: plain.levels.map((level) => ({ ...level, fingerprint: `settings-${of.fingerprint}` })),
        },
        recordingId,
        usedMs: of.usedMs,
        machineState: 'running',
        condition: '',
        runningHours: null,
        evaluated: true,
        inTrend: of.inTrend,
        atAlarm: false,
      });
      onTwin = () => twin.measure(of);
    } else {
      const subject = subjectOf(of.point);
      const key = subjectKey(subject);
      const before = (await loadAlarms(writer, [key])).get(key)?.state ?? normalState;
      const state = nextState(before, of.to);
      const event = of.to === 'normal' ? 'returned' : 'raised';
      await saveAlarmChange(
        writer,
        {
          subject,
          state,
          journal: [
            { event, before: before.condition, after: of.to, usedMs: null, comment: null, reason: {} },
          ],
          tell: null,
        },
        { ids, wallMs: 1, recordingId: null, actor: 'service', via: 'service', fromBacklog: false },
      );
      onTwin = () => twin.alarm(key, state, event);
    }
    if (of.fails) throw failing;
    return onTwin;
  });
  const onTwin = await transaction.catch((error: unknown) => {
    if (error !== failing) throw error;
    return () => {};
  });
  onTwin();
}

async function compare(ledger: Ledger, ids: SiteIds, twin: Twin): Promise<void> {
  await ledger.read(async (reader) => {
    for (const point of points) {
      const pointId = ids.pointId('pump', point);
      const names = new Map(bands.map((band) => [ids.bandId('pump', point, band), band]));
      const rows = await readLevels(reader, { pointId, fromMs: 2, toMs: 6, limit: 100 });
      const wanted = twin.levels.filter(
        (row) => row.point === point && row.inTrend && row.usedMs >= 2 && row.usedMs < 6,
      );
      const order = (row: {
        readonly usedMs: number;
        readonly band: string | undefined;
        readonly level: number;
      }) => `${row.usedMs} ${row.band} ${row.level}`;
      expect(rows.map((row) => order({ ...row, band: names.get(row.bandId) })).sort()).toEqual(
        wanted.map(order).sort(),
      );
      expect(rows.map((row) => row.usedMs)).toEqual(rows.map((row) => row.usedMs).sort((a, b) => a - b));
      const newest = await newestMeasurement(reader, pointId);
      const times = twin.measurements.filter((row) => row.point === point).map((row) => row.usedMs);
      expect(newest?.usedMs ?? null).toBe(times.length === 0 ? null : Math.max(...times));
    }
    for (let identity = 1; identity <= 12; identity++) {
      expect((await findTaken(reader, `${identity}`)) !== null).toBe(twin.identities.has(`${identity}`));
    }
    const stored = await loadAlarms(
      reader,
      [0, 1].map((point) => subjectKey(subjectOf(point))),
    );
    expect(new Map([...stored].map(([key, alarm]) => [key, alarm.state]))).toEqual(twin.states);
    const standing = (await standingAlarms(reader)).map(({ life }) => ({
      number: life.number,
      key: life.key,
      severity: life.severity,
      ended: false,
    }));
    expect(standing).toEqual(twin.lives.filter((life) => !life.ended));
    const journal = await readJournal(reader, { afterSequence: 0, limit: 1000 });
    expect(journal.map((row) => `${row.key} ${row.event}`)).toEqual(twin.journal);
  });
}

test('whatever is saved and whatever fails, the ledger says the same as a plain list', async () => {
  const { site, text } = smallSite({ pump: { de: bands, nde: bands } });
  await fc.assert(
    fc.asyncProperty(fc.array(work, { minLength: 1, maxLength: 25 }), async (steps) => {
      const folder = temporaryFolder();
      let ledger = await opened(folder);
      const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
      const twin = new Twin();
      for (const step of steps) {
        if (step.do === 'reopen') {
          await ledger.close();
          ledger = await opened(folder);
        } else {
          await perform(ledger, ids, twin, step);
        }
        await compare(ledger, ids, twin);
      }
      await ledger.close();
    }),
    { seed: 20261201, numRuns: 40 },
  );
});
