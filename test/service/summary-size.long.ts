/**
 * How long the summary of a large site takes to gather: 200 points of 12 bands, hourly, eight days in the ledger, and three
 * years of days before them; every machine has ten sisters.
 */
import { sql } from 'kysely';
import { expect, it } from 'vitest';
import { summaryNow } from '../../src/service/morning.ts';
import type { Writer } from '../../src/store/lent-connection.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { noteArrival } from '../../src/store/sources.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from '../store/new-recording.ts';
import { measurementOf, type Tree } from '../store/small-site.ts';
import { ann, hourMs, MailBench } from './mail-bench.ts';

it('takes a second or two, and holds up nobody meanwhile', async () => {
  const bands = Array.from({ length: 12 }, (_, index) => `band-${index}`);
  const tree: Tree = Object.fromEntries(
    Array.from({ length: 50 }, (_, machine) => [
      `fan-${machine}`,
      Object.fromEntries(['a', 'b', 'c', 'd'].map((point) => [point, bands])),
    ]),
  );
  const b = await MailBench.start({ tree, to: [{ address: ann }] });
  const machines = b.view.site.machines.map((machine, n) => ({ ...machine, like: [`fan-${n - (n % 10)}`] }));
  const view = { ...b.view, site: { ...b.view.site, machines } };
  const { ids, points } = b.view;
  const beganMs = b.clock.wallMs();
  for (let hour = 0; hour < 192; hour++) {
    const usedMs = beganMs + hour * hourMs;
    await b.ledger.transact(async (writer) => {
      for (const { machineId, id } of points) {
        const identity = `${hour} ${machineId} ${id}`;
        const about = {
          identity,
          contentSha256: identity,
          configVersionId: ids.configVersionId,
          usedMs,
          arrivedMs: usedMs,
        };
        const recordingId = await insertRecording(writer, recordingOf(about));
        const levels = Object.fromEntries(
          bands.map((band, index) => [band, 0.001 + index * 1e-5 + (hour % 7) * 1e-6]),
        );
        const measurement = measurementOf(machineId, id, levels);
        await insertMeasurement(writer, ids, {
          measurement,
          recordingId,
          usedMs,
          machineState: 'running',
          condition: '',
          runningHours: null,
          evaluated: true,
          inTrend: true,
          atAlarm: false,
        });
        await noteArrival(writer, ids.pointId(machineId, id), { arrivedMs: usedMs, usedMs, evaluated: true });
      }
    });
  }
  await b.ledger.transact(yearsOfDays);
  b.clock.advance(192 * hourMs);
  const nowMs = b.clock.wallMs();
  let longestTurnMs = 0;
  let last = performance.now();
  const turns = setInterval(() => {
    longestTurnMs = Math.max(longestTurnMs, performance.now() - last);
    last = performance.now();
  }, 1);
  const begun = performance.now();
  const cpuBefore = process.cpuUsage();
  const { facts, mail, html } = await summaryNow({
    ledger: b.ledger,
    view,
    nowMs,
    upSinceMs: beganMs,
  });
  const tookMs = performance.now() - begun;
  const cpu = process.cpuUsage(cpuBefore);
  const workedMs = (cpu.user + cpu.system) / 1000;
  clearInterval(turns);
  console.info(
    `summary of ${facts.points.length} points, ${bands.length} bands each: ${tookMs.toFixed(0)} ms, ${workedMs.toFixed(0)} ms of them worked, longest turn ` +
      `${longestTurnMs.toFixed(0)} ms, mail ${mail.html.length} bytes, file ${html.length} bytes`,
  );
  expect(facts.points.every(({ bands: all }) => all.every(({ change }) => change !== null))).toBe(true);
  expect(facts.points.every(({ bands: all }) => all.every(({ trend }) => trend?.trend.kind === 'none'))).toBe(
    true,
  );
  // A machine that has other work takes longer by the clock, not by the work.
  expect(workedMs).toBeLessThan(5_000);
});

/** Three years of days before the newest ones, of every series. */
async function yearsOfDays(writer: Writer): Promise<void> {
  await sql`
    with recursive ago(n) as (select 1 union all select n + 1 from ago where n < 1095)
    insert into daily_levels
    select point_id, band_id, series_id, 0, first.day - n, first.used_ms - n * 86400000, (1200 - n) * 24.0, 24, 0.001,
      0.001 + 0.0001 * ((point_id * 7 + band_id * 13 + n * 31) % 17) / 17, 0.0012
    from (select point_id, band_id, series_id, min(used_ms) as used_ms, min(used_ms) / 86400000 as day
      from levels group by point_id, band_id, series_id) as first, ago`.execute(writer);
}
