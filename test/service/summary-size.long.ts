/** How long the summary of a large site takes to gather: 200 points of 12 bands, hourly, eight days in the ledger. */
import { expect, it } from 'vitest';
import { summaryNow } from '../../src/service/morning.ts';
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
  b.clock.advance(192 * hourMs);
  const nowMs = b.clock.wallMs();
  let longestTurnMs = 0;
  let last = performance.now();
  const turns = setInterval(() => {
    longestTurnMs = Math.max(longestTurnMs, performance.now() - last);
    last = performance.now();
  }, 1);
  const begun = performance.now();
  const { facts, mail, html } = await summaryNow({
    ledger: b.ledger,
    view: b.view,
    nowMs,
    upSinceMs: beganMs,
  });
  const tookMs = performance.now() - begun;
  clearInterval(turns);
  console.info(
    `summary of ${facts.points.length} points, ${bands.length} bands each: ${tookMs.toFixed(0)} ms, longest turn ` +
      `${longestTurnMs.toFixed(0)} ms, mail ${mail.html.length} bytes, file ${html.length} bytes`,
  );
  expect(facts.points.every(({ bands: all }) => all.every(({ change }) => change !== null))).toBe(true);
  expect(tookMs).toBeLessThan(5_000);
});
