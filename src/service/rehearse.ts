import { recipientsFor } from '../advisory/recipients.ts';
import { type HowOften, timesWithin } from '../config/how-often.ts';
import { loadSite } from '../config/load.ts';
import type { Band, Machine, Point, Severity, Site } from '../config/site.ts';
import { subjectKey } from '../detection/alarm.ts';
import { limitSubject } from '../detection/detect.ts';
import { type CarriedIds, carriedIds } from '../store/carried-ids.ts';
import { configInForce } from '../store/config-texts.ts';
import type { Ledger } from '../store/ledger.ts';
import { type PastAlarm, pastAlarms } from '../store/past-alarms.ts';
import { timeOfLevels } from '../store/point-history.ts';
import { quarterDays } from './point-columns.ts';
import { type LimitRehearsal, rehearsePoint } from './rehearse-point.ts';
import { type SettingsInForce, settingsInForce } from './same-settings.ts';

/**
 * A site file that is not in force yet, over the levels that the ledger has: which alarms would have come by it, beside
 * those that did come. Only read; the service may run. Alarms of limits only: troubles follow from recordings, not
 * from levels.
 */
export interface RehearseQuestion {
  readonly site: Site;
  /** Used times to look at, `fromMs` included, `toMs` not; as far as the ledger has levels. */
  readonly fromMs: number;
  readonly toMs: number;
  /** One machine; null: all. */
  readonly machineId: string | null;
  /** How often an alarm of one limit is wanted at most; null: nothing is suggested. */
  readonly wanted: HowOften | null;
  readonly progress: (donePoints: number, points: number) => void;
}

export interface SiteRehearsal {
  /** The time that was looked at: from the first level to the newest recording, as far as it was asked for. */
  readonly fromMs: number;
  readonly toMs: number;
  readonly limits: readonly RehearsedLimit[];
  /** Bands with a limit whose levels the ledger does not have. */
  readonly cannot: readonly { readonly point: Point; readonly band: Band; readonly why: string }[];
  /** Alarms that came of limits that this site file does not have, by their keys. */
  readonly gone: ReadonlyMap<string, readonly PastAlarm[]>;
  readonly people: readonly PersonsShare[];
  /** What is to be known of how it was rehearsed. */
  readonly remarks: readonly string[];
}

export interface RehearsedLimit extends LimitRehearsal {
  readonly machine: Machine;
  readonly point: Point;
  /** Oldest first. */
  readonly came: readonly PastAlarm[];
}

/** What one recipient of mail would have been told. */
export interface PersonsShare {
  readonly address: string;
  readonly told: number;
  /** The week with the most of them, counted from the first day; null: none. */
  readonly busiest: { readonly fromMs: number; readonly told: number } | null;
}

const weekMs = 7 * 86_400_000;

/** Null where the ledger has no levels of that time. */
export async function rehearseSite(
  ledger: Ledger,
  question: RehearseQuestion,
): Promise<SiteRehearsal | null> {
  const { site, machineId } = question;
  const levels = await ledger.read(timeOfLevels);
  if (levels === null) return null;
  const fromMs = Math.max(question.fromMs, levels.firstMs);
  const toMs = Math.min(question.toMs, levels.newestMs + 1);
  if (fromMs >= toMs) return null;
  const { ids, settings } = await ledgerView(ledger, site);
  const machines = site.machines.filter(({ id }) => machineId === null || id === machineId);
  const points = machines.flatMap((machine) => machine.points.map((point) => ({ machine, point })));
  const came = await ledger.read((reader) => pastAlarms(reader, { fromMs, toMs }));
  const cameOf = new Map<string, PastAlarm[]>();
  for (const alarm of came) cameOf.set(alarm.key, [...(cameOf.get(alarm.key) ?? []), alarm]);
  const most = question.wanted === null ? null : timesWithin(question.wanted, toMs - fromMs);
  const time = { fromMs, toMs, dayOf: quarterDays(site.timeZone), most };
  const limits: RehearsedLimit[] = [];
  const cannot: { point: Point; band: Band; why: string }[] = [];
  for (const [n, { machine, point }] of points.entries()) {
    question.progress(n, points.length);
    const known = knownBands(ids, settings, point);
    cannot.push(...known.cannot);
    const [machineRow, pointRow] = [ids.machine(machine.id), ids.point(point)];
    if (machineRow === null || pointRow === null) continue;
    const rehearsed = await rehearsePoint(
      ledger,
      {
        machine,
        point,
        machineLedgerId: machineRow.id,
        pointLedgerId: pointRow.id,
        bands: known.bands,
        sameConditions: settings?.otherConditions(machine) !== true,
      },
      time,
    );
    for (const one of rehearsed) {
      const key = keyInLedger(ids, point, one);
      limits.push({ ...one, machine, point, came: cameOf.get(key) ?? [] });
      cameOf.delete(key);
    }
  }
  question.progress(points.length, points.length);
  return {
    fromMs,
    toMs,
    limits,
    cannot,
    gone:
      machineId === null
        ? cameOf
        : new Map([...cameOf].filter(([key]) => key.startsWith(`limit:${machineId}/`))),
    people: peopleOf(site, limits, { fromMs, toMs }),
    remarks: remarksOf(machines, settings),
  };
}

async function ledgerView(
  ledger: Ledger,
  site: Site,
): Promise<{ readonly ids: CarriedIds; readonly settings: SettingsInForce | null }> {
  return ledger.read(async (reader) => {
    const ids = await carriedIds(reader, site);
    const text = await configInForce(reader);
    const answer = text === null ? null : loadSite(text, site.file);
    if (answer === null || !answer.ok) return { ids, settings: null };
    const inForce = { site: answer.site, ids: await carriedIds(reader, answer.site) };
    return { ids, settings: settingsInForce({ site, ids }, inForce) };
  });
}

function knownBands(ids: CarriedIds, settings: SettingsInForce | null, point: Point) {
  const bands: { band: Band; bandLedgerId: number }[] = [];
  const cannot: { point: Point; band: Band; why: string }[] = [];
  for (const band of point.bands) {
    if (!point.limits.some(({ bandId }) => bandId === band.id)) continue;
    const row = ids.band(point, band);
    const why = row === null ? 'the ledger has no level of it' : (settings?.otherLevels(point, band) ?? null);
    if (row !== null && why === null) bands.push({ band, bandLedgerId: row.id });
    else cannot.push({ point, band, why: why ?? '' });
  }
  return { bands, cannot };
}

/** The key of the limit's alarm as it is now, before this site file is in force. */
function keyInLedger(ids: CarriedIds, point: Point, { limit, band }: LimitRehearsal): string {
  const subject = limitSubject(point, limit);
  if (subject.kind !== 'limit') throw new Error('a limit has no trouble');
  return subjectKey({
    ...subject,
    machineId: ids.machine(point.machineId)?.idInSite ?? point.machineId,
    pointId: ids.point(point)?.idInSite ?? point.id,
    bandId: ids.band(point, band)?.idInSite ?? band.id,
    limitId: ids.limit(point, limit)?.idInSite ?? limit.id,
  });
}

function peopleOf(
  { mail }: Site,
  limits: readonly RehearsedLimit[],
  { fromMs, toMs }: Pick<SiteRehearsal, 'fromMs' | 'toMs'>,
): PersonsShare[] {
  const to = mail?.to ?? [];
  const weeks = new Map<string, number[]>();
  for (const { address } of to) weeks.set(address, []);
  for (const { machine, rehearsal } of limits) {
    const reached = new Map<Severity, readonly string[]>();
    for (const { usedMs, severity } of rehearsal.alarms.flatMap(({ told }) => told)) {
      if (usedMs < fromMs || usedMs >= toMs) continue;
      const week = Math.floor((usedMs - fromMs) / weekMs);
      const addresses = reached.get(severity) ?? recipientsFor(to, machine, severity);
      reached.set(severity, addresses);
      for (const address of addresses) weeks.get(address)?.push(week);
    }
  }
  return [...weeks].map(([address, told]) => {
    const counts = new Map<number, number>();
    for (const week of told) counts.set(week, (counts.get(week) ?? 0) + 1);
    const [busiest] = [...counts].sort(([a, most], [b, other]) => other - most || a - b);
    return {
      address,
      told: told.length,
      busiest: busiest === undefined ? null : { fromMs: fromMs + busiest[0] * weekMs, told: busiest[1] },
    };
  });
}

function remarksOf(machines: readonly Machine[], settings: SettingsInForce | null): string[] {
  const running = machines.filter((machine) => settings?.otherRunning(machine) === true);
  const byDesign = machines
    .flatMap(({ points }) => points.flatMap(({ limits }) => limits))
    .filter(({ suppressedWhile = [] }) => suppressedWhile.length > 0);
  return [
    ...(settings === null
      ? ['the site file in force is not known: levels are taken as this file would give them']
      : []),
    ...running.map(
      ({ id }) => `${id}: running and after_start are other ones; whether it ran is as it was judged then`,
    ),
    ...(byDesign.length === 0
      ? []
      : [`suppressed_while is left out: ${byDesign.length} limits are counted as if nothing held them back`]),
  ];
}
