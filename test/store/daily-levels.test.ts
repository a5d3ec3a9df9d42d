import { expect, test } from 'vitest';
import { dailyLevels, keepDailyLevels } from '../../src/store/daily-levels.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from './new-recording.ts';
import { measurementOf, smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const hour = 3_600_000;
/** A site two hours ahead of UTC. */
const dayOf = (ms: number) => Math.floor((ms + 2 * hour) / (24 * hour));

async function plant() {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: ['overall'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  const pointId = ids.pointId('pump', 'de');
  const bandId = ids.bandId('pump', 'de', 'overall');
  const measured = measurementOf('pump', 'de', { overall: 1 });
  return {
    take: (atHour: number, level: number, more: { condition?: string; inTrend?: boolean } = {}) =>
      ledger.transact(async (writer) => {
        const usedMs = atHour * hour;
        const recordingId = await insertRecording(
          writer,
          recordingOf({ identity: `${atHour} ${level}`, usedMs }),
        );
        await insertMeasurement(writer, ids, {
          measurement: { ...measured, levels: measured.levels.map((one) => ({ ...one, level })) },
          recordingId,
          usedMs,
          machineState: 'running',
          condition: more.condition ?? '',
          runningHours: atHour / 2,
          evaluated: true,
          inTrend: more.inTrend ?? true,
          atAlarm: false,
        });
        return keepDailyLevels(writer, pointId, usedMs, dayOf);
      }),
    days: () => ledger.read((reader) => dailyLevels(reader, { pointId, bandId, fromMs: 0, toMs: 1e12 })),
  };
}

test('a day is reckoned with the first recording of a later local day', async () => {
  const { take, days } = await plant();
  // 22:00 UTC is midnight on site.
  expect(await take(2, 1)).toBeNull();
  expect(await take(20, 5)).toBeNull();
  expect(await take(21, 3)).toBeNull();
  expect(await days()).toEqual([]);
  expect(await take(22, 9)).toBe(0);
  expect(await days()).toMatchObject([
    { day: 0, count: 3, least: 1, median: 3, greatest: 5, usedMs: 20 * hour, runningHours: 10 },
  ]);
});

test('a late recording is reckoned into its day; the newest day is left to go on', async () => {
  const { take, days } = await plant();
  await take(5, 1);
  await take(30, 7);
  expect(await days()).toMatchObject([{ day: 0, count: 1, median: 1 }]);
  expect(await take(6, 2)).toBe(0);
  expect(await days()).toMatchObject([{ day: 0, count: 2, median: 1.5 }]);
  await take(60, 1);
  expect(await days()).toMatchObject([{ day: 0 }, { day: 1, count: 1, median: 7 }]);
});

test('operating conditions are kept apart, and what is out of the trend is left out', async () => {
  const { take, days } = await plant();
  await take(3, 1, { condition: 'part' });
  await take(4, 10, { condition: 'full' });
  await take(5, 100, { inTrend: false });
  await take(40, 1);
  expect((await days()).map(({ conditionId, count, median }) => [conditionId, count, median])).toEqual([
    [1, 1, 1],
    [2, 1, 10],
  ]);
});
