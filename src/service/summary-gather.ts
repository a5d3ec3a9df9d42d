import type { PointNow, SummaryFacts } from '../advisory/summary-facts.ts';
import { localDate, localDay } from '../config/local-time.ts';
import { pointPath } from '../config/site.ts';
import type { MachineMemory } from '../detection/machine-state.ts';
import { loadAllAlarms, standingAlarms } from '../store/alarms.ts';
import { conditionNames } from '../store/conditions.ts';
import { readJournal } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { arrivalsOf, loadMachine } from '../store/sources.ts';
import { lastSummary } from '../store/summaries.ts';
import { placesOutOfService } from '../store/suppressions.ts';
import { diskRoom, freeBytes, ledgerBytes } from './disk-room.ts';
import { machineFacts, siteFacts } from './fact-names.ts';
import { readHealth } from './health.ts';
import { repairsNow } from './repair-facts.ts';
import { besideTheirSisters, sisterKey, sistersOf } from './sister-facts.ts';
import type { SiteView } from './site-view.ts';
import { heldNow, isOutOfService } from './summary-held.ts';
import {
  type Day,
  historyOf,
  limitsRemovedSince,
  otherFiles,
  receivedOfExpected,
  serviceNow,
} from './summary-periods.ts';
import { alarmsByPoint, type PointGathered, pointNow } from './summary-points.ts';
import { standingNow } from './summary-standing.ts';

/**
 * From the ledger to everything that a summary says. Point by point, with a turn of the event loop between them, so
 * that neither the page nor intake waits for the whole site. Only bounded queries: eight days of each point's levels.
 */
export interface SummaryQuestion {
  readonly ledger: Ledger;
  readonly view: SiteView;
  readonly nowMs: number;
  /** Wall time at which the running service began. */
  readonly upSinceMs: number;
}

const dayMs = 86_400_000;

export async function gatherSummary(question: SummaryQuestion): Promise<SummaryFacts> {
  const { ledger, view, nowMs } = question;
  const { site } = view;
  const known = await ledger.read((reader) => readKnown(reader, view, nowMs));
  const day: Day = { view, nowMs, sinceMs: nowMs - dayMs, watchedFromMs: known.watchedFromMs ?? nowMs };
  const gathered = await gatherPoints(question, known);
  const points = await withSisters(question, gathered);
  const disk = {
    ms: nowMs,
    freeBytes: await freeBytes(site.folders.data),
    ledgerBytes: ledgerBytes(ledger),
    watchedFromMs: day.watchedFromMs,
  };
  const unassignedNow = readHealth(site.folders.data)?.unassignedCount ?? 0;
  const longStopped = site.machines.flatMap((machine) => {
    const memory = known.memories.get(machine.id);
    const stopped = memory?.state === 'stopped' && nowMs - memory.sinceMs > machine.stoppedExpectedMs;
    return stopped ? [{ machine: machineFacts(view, machine.id), sinceMs: memory.sinceMs }] : [];
  });
  return ledger.read(async (reader) => ({
    site: siteFacts(view),
    writtenMs: nowMs,
    sinceMs: day.sinceMs,
    points,
    standing: await standingNow(reader, view, await standingAlarms(reader), points),
    ...(await heldNow(reader, view, known.places, nowMs)),
    repairs: await repairsNow(reader, view, nowMs),
    longStopped,
    limitsRemoved: await limitsRemovedSince(reader, known.lastSummaryMs ?? day.sinceMs),
    recordings: {
      ...(await receivedOfExpected(reader, day, known.arrivals)),
      ...(await otherFiles(reader, day, unassignedNow)),
    },
    history: await historyOf(reader, day),
    service: await serviceNow(reader, day, question.upSinceMs, await diskRoom(reader, site, disk)),
  }));
}

type Known = Awaited<ReturnType<typeof readKnown>>;

async function readKnown(reader: Reader, view: SiteView, nowMs: number) {
  const memories = new Map<string, MachineMemory>();
  for (const { id } of view.site.machines) {
    const stored = await loadMachine(reader, view.ids.machineId(id));
    if (stored !== null) memories.set(id, JSON.parse(stored.state) as MachineMemory);
  }
  const [first] = await readJournal(reader, { afterSequence: 0, limit: 1 });
  return {
    alarms: alarmsByPoint(await loadAllAlarms(reader)),
    arrivals: await arrivalsOf(reader),
    memories,
    conditions: await conditionNames(reader),
    places: await placesOutOfService(reader),
    /** The journal begins with the first start. */
    watchedFromMs: first?.wallMs ?? null,
    lastSummaryMs: (await lastSummary(reader, localDate(nowMs, view.site.timeZone)))?.createdMs ?? null,
  };
}

async function gatherPoints({ ledger, view, nowMs }: SummaryQuestion, known: Known) {
  const points: PointGathered[] = [];
  const sisters = sistersOf(view.site.machines);
  for (const machine of view.site.machines) {
    for (const point of machine.points) {
      const pointId = view.ids.pointId(machine.id, point.id);
      const about = {
        view,
        machine,
        point,
        alarms: known.alarms.get(pointPath(point)) ?? [],
        arrivals: known.arrivals.get(pointId),
        memory: known.memories.get(machine.id) ?? null,
        outOfService: isOutOfService(known.places, machine.id, point.id),
        nowMs,
        hasSisters: (sisters.get(machine.id)?.length ?? 0) > 0,
        conditions: known.conditions,
      };
      points.push(await ledger.read((reader) => pointNow(reader, about)));
      await new Promise<void>((resolve) => setImmediate(resolve));
    }
  }
  return points;
}

/** Once all points are known: each band with what its sister machines say of it. */
async function withSisters(
  { view, nowMs }: SummaryQuestion,
  gathered: readonly PointGathered[],
): Promise<PointNow[]> {
  const behind = gathered.flatMap((one) => one.behind ?? []);
  const beside = await besideTheirSisters(view, behind, localDay(nowMs, view.site.timeZone));
  return gathered.map(({ now }) => ({
    ...now,
    bands: now.bands.map((one) => {
      const sister = beside.get(sisterKey(now.machine.id, now.point.id, one.band.id));
      return sister === undefined ? one : { ...one, sister };
    }),
  }));
}
