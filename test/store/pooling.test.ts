import { expect, test } from 'vitest';
import { Measurer } from '../../src/manipulation/measure.ts';
import { pooledMeasurement } from '../../src/manipulation/measure-pooled.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { type Pool, poolStep } from '../../src/manipulation/pooling.ts';
import { dropOtherPools, loadPool, savePool } from '../../src/store/pooling.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { testBand, testPoint, testSettings } from '../manipulation/point.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { recordingOf } from './new-recording.ts';
import { smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const burstPoint = testPoint(
  {
    bands: [testBand('high', 'acceleration', 1000, 2000)],
    envelope: { band: { fromHz: 2000, toHz: 4000 }, choose: 'fixed', lineSpacingHz: 100, highestHz: 0 },
  },
  { segmentSamples: 512, averageOver: { recordings: 9 } },
);

function burst(seed: number): Measurement {
  const measurer = new Measurer(testSettings(burstPoint, { sampleRateHz: 12_800 }));
  measurer.add(gaussianNoise(seededRandom(seed), 1024));
  measurer.end({ timeStepDeviation: null });
  return measurer.finish({ speed: null, findings: [] });
}

function grow(pool: Pool | null, measurement: Measurement, usedMs: number): Pool {
  const arrival = { measurement, usedMs, running: true, condition: '', flagged: false };
  const limits = { averageOver: { recordings: 9 }, expectedEveryMs: 1000, overdueAfterMs: 1e6 };
  const { open } = poolStep(pool, arrival, limits);
  if (open === null) throw new Error('the pool is over');
  return open;
}

async function ledgerWithRecording() {
  const folder = temporaryFolder();
  const ledger = await opened(folder);
  const { site, text } = smallSite({ pump: { de: ['high'], nde: ['high'] } });
  const { ids } = await ledger.transact((writer) => syncSite(writer, site, { text, wallMs: 1 }));
  const recordingId = await ledger.transact((writer) => insertRecording(writer, recordingOf()));
  return { folder, ledger, recordingId, de: ids.pointId('pump', 'de'), nde: ids.pointId('pump', 'nde') };
}

test('an open pool comes back bit for bit, envelope included, and goes on as if it had never been stored', async () => {
  const { folder, ledger, recordingId, de } = await ledgerWithRecording();
  const [first, second, third] = [1, 2, 3].map(burst);
  const pool = grow(grow(null, first, 1000), second, 2000);
  expect(pool.envelope?.segments).toHaveLength(2);
  const newest = { recordingId, runningHours: 3.25, measurement: second };
  await ledger.transact((writer) => savePool(writer, de, { pool: grow(null, first, 1000), newest }));
  await ledger.transact((writer) => savePool(writer, de, { pool, newest }));
  await ledger.close();
  const again = await opened(folder);
  const open = await again.read((reader) => loadPool(reader, de));
  expect(open?.pool).toEqual(pool);
  expect(open?.newest).toMatchObject({ recordingId, runningHours: 3.25 });
  if (open === null) throw new Error('no pool');
  const whole = pooledMeasurement(burstPoint, third, grow(pool, third, 3000));
  expect(pooledMeasurement(burstPoint, third, grow(open.pool, third, 3000))).toEqual(whole);
  // Judged early it is judged by the newest recording as the ledger holds it.
  const early = pooledMeasurement(burstPoint, open.newest.measurement, open.pool);
  expect(early.levels).toEqual(pooledMeasurement(burstPoint, second, pool).levels);
  expect(early.envelope).toEqual(pooledMeasurement(burstPoint, second, pool).envelope);
});

test('pools of points that pool no longer are dropped, the others stay', async () => {
  const { ledger, recordingId, de, nde } = await ledgerWithRecording();
  const measurement = burst(1);
  const open = { pool: grow(null, measurement, 1), newest: { recordingId, runningHours: 0, measurement } };
  await ledger.transact(async (writer) => {
    await savePool(writer, de, open);
    await savePool(writer, nde, open);
    await dropOtherPools(writer, [nde]);
  });
  expect(await ledger.read((reader) => loadPool(reader, de))).toBeNull();
  expect(await ledger.read((reader) => loadPool(reader, nde))).not.toBeNull();
});

test('a density that is not finite is never stored', async () => {
  const { ledger, recordingId, de } = await ledgerWithRecording();
  const measurement = burst(1);
  const pool = grow(null, measurement, 1);
  pool.density.density[3] = Number.NaN;
  const newest = { recordingId, runningHours: 0, measurement };
  await expect(ledger.transact((writer) => savePool(writer, de, { pool, newest }))).rejects.toThrow(
    'not finite',
  );
});
