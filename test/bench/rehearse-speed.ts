import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { Site } from '../../src/config/site.ts';
import { rehearseSite } from '../../src/service/rehearse.ts';
import { readSiteFile } from '../../src/service/site-in-force.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { isLedgerRefusal } from '../../src/store/ledger-error.ts';
import { openLedger } from '../../src/store/open-ledger.ts';
import { pastLevels } from '../../src/store/point-history.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { type SiteIds, syncSite } from '../../src/store/site-ids.ts';
import { noteArrival } from '../../src/store/sources.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { plantLogLevels } from '../prognosis/plant-levels.ts';
import { recordingOf } from '../store/new-recording.ts';
import { measurementOf } from '../store/small-site.ts';

/** Hourly levels of twelve bands, each with a limit: eight statistical, four fixed. */
const bands = 12;
const points = ['a'];
const days = 365;
const hourMs = 3_600_000;
const beginMs = Date.UTC(2026, 0, 1);
const seed = 20261201;

export interface RehearseSpeed {
  readonly levels: number;
  readonly cpuUsALevel: number;
  /** Of the same levels, only read. */
  readonly readCpuUsALevel: number;
  /** 200 points of 12 bands, hourly for a year, by this speed; CPU of one core. */
  readonly yearOfLargeSiteS: number;
}

/** What rehearsing takes, against reading the same levels and doing nothing with them. */
export async function rehearseSpeed(): Promise<RehearseSpeed> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-bench-'));
  const site = siteIn(folder);
  const ledger = await openLedger({
    folder: site.folders.data,
    mode: 'owner',
    wallMs: () => beginMs,
    monotonicMs: () => performance.now(),
  });
  if (isLedgerRefusal(ledger)) throw new Error(ledger.reason);
  try {
    const ids = await ledger.transact(
      async (writer) => (await syncSite(writer, site, { text: '', wallMs: beginMs })).ids,
    );
    for (const [n, point] of points.entries()) await fill(ledger, ids, point, seed + n);
    const levels = points.length * bands * days * 24;
    const toMs = beginMs + days * 24 * hourMs;
    const question = { site, fromMs: beginMs, toMs, machineId: null, wanted: null, progress: () => {} };
    const cpuUsALevel = await cpuUsEach(levels, () => rehearseSite(ledger, question));
    const readCpuUsALevel = await cpuUsEach(levels, async () => {
      for (const point of points) {
        const pointId = ids.pointId('fan-1', point);
        const range = { pointId, fromMs: beginMs, toMs, exceeded: true, intervals: false };
        await ledger.read((reader) => pastLevels(reader, range));
      }
    });
    const yearOfLargeSiteS = (200 * 12 * 8766 * cpuUsALevel) / 1e6;
    return { levels, cpuUsALevel, readCpuUsALevel, yearOfLargeSiteS };
  } finally {
    await ledger.close();
    rmSync(folder, { recursive: true });
  }
}

/** The best of several rounds keeps out what else the machine does meanwhile. */
async function cpuUsEach(levels: number, work: () => Promise<unknown>): Promise<number> {
  let best = Number.POSITIVE_INFINITY;
  for (let round = 0; round < 5; round++) {
    const before = process.cpuUsage();
    await work();
    const { user, system } = process.cpuUsage(before);
    best = Math.min(best, (user + system) / levels);
  }
  return best;
}

async function fill(ledger: Ledger, ids: SiteIds, point: string, ownSeed: number): Promise<void> {
  const logs = plantLogLevels(ownSeed, { bands, days, course: () => 0 });
  for (let day = 0; day < days; day++) {
    await ledger.transact(async (writer) => {
      for (let hour = 24 * day; hour < 24 * (day + 1); hour++) {
        const usedMs = beginMs + hour * hourMs;
        const identity = `${point} ${hour}`;
        const recordingId = await insertRecording(
          writer,
          recordingOf({ identity, contentSha256: identity, configVersionId: ids.configVersionId, usedMs }),
        );
        const levels = Object.fromEntries(
          logs.map((band, n) => [`b${n}`, 1e-3 * Math.exp(band[hour] as number)]),
        );
        await insertMeasurement(writer, ids, {
          measurement: measurementOf('fan-1', point, levels),
          recordingId,
          usedMs,
          machineState: 'running',
          condition: '',
          runningHours: hour,
          evaluated: true,
          inTrend: true,
          atAlarm: false,
        });
        await noteArrival(writer, ids.pointId('fan-1', point), {
          arrivedMs: usedMs,
          usedMs,
          evaluated: true,
        });
      }
    });
  }
}

function siteIn(folder: string): Site {
  const text = `site: Rehearsal bench
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>.wav
  expected_every: 1 h
  samples_in: m/s2
machine_types:
  rotating:
    bands:
${Array.from({ length: bands }, (_, n) => `      - { id: b${n}, quantity: velocity, from: ${10 + 50 * n} Hz, to: ${60 + 50 * n} Hz, unit: mm/s }\n`).join('')}    limits:
${Array.from({ length: bands }, (_, n) => `      - { band: b${n}, ${n < 8 ? 'kind: statistical' : 'alert: 1.3 mm/s, danger: 4.5 mm/s'} }\n`).join('')}machines:
  - id: fan-1
    type: rotating
    points:
${points.map((id, n) => `      - { id: ${id}, channel: ${n + 1}, quantity: acceleration }\n`).join('')}`;
  const path = join(folder, 'site.yaml');
  writeFileSync(path, text);
  const read = readSiteFile(path);
  if ('problems' in read) throw new Error(read.problems.join('\n'));
  return read.site;
}
