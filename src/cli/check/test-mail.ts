import { alarmMail } from '../../advisory/alarm-mail.ts';
import type { AlarmFacts, AlarmMailFacts, Mail } from '../../advisory/facts.ts';
import { compareLines } from '../../advisory/line-changes.ts';
import { testMail } from '../../advisory/notices.ts';
import { shareOfAlert } from '../../advisory/ranking.ts';
import { type Machine, type MailSettings, type Point, pointPath, type Site } from '../../config/site.ts';
import { usualDisplayUnit } from '../../config/units.ts';
import { speaksForFault } from '../../manipulation/evidence.ts';
import type { BandLevel, Measurement } from '../../manipulation/measurement.ts';
import { asAlarm, whyNone } from '../../service/as-alarm.ts';
import { bandFacts } from '../../service/fact-names.ts';
import { type LimitInForce, limitFactsNow, limitsOfMeasured } from '../../service/limits-in-force.ts';
import { readersView } from '../../service/readers-view.ts';
import { measuredReading, zoneFacts } from '../../service/zone-facts.ts';
import type { Ledger } from '../../store/ledger.ts';
import { lookAtDrop } from './drop-look.ts';
import { FileLevels } from './file-levels.ts';

/** The mails by which a site tries out its mail; nothing of them is stored. */

type MailOrReason = { readonly mail: Mail } | { readonly refused: string };

/** `check --mail`. */
export function plainTestMail(
  site: Site,
  settings: MailSettings,
  recipients: readonly string[],
  nowMs: number,
): Mail {
  const points = site.machines.flatMap((machine) => machine.points);
  return testMail({
    site: { name: site.name, timeZone: site.timeZone },
    writtenMs: nowMs,
    from: settings.from,
    to: recipients,
    server: `${settings.server.host}:${settings.server.port}`,
    points: points.length,
    limits: points.reduce((sum, { limits }) => sum + limits.length, 0),
  });
}

/**
 * `check --mail --as-alarm`: from the ledger's newest recording of the point; without one from the newest file in the
 * drop folder, which has no past to compare with.
 */
export async function mailAsAlarm(
  site: Site,
  at: { readonly machine: Machine; readonly point: Point },
  ledger: Ledger | null,
  nowMs: number,
): Promise<MailOrReason> {
  if (at.point.limits.length === 0)
    return { refused: `${pointPath(at.point)} has no limit in the site file, so it can never alarm` };
  const facts =
    (ledger === null ? null : await fromLedger(site, at.point, ledger, nowMs)) ??
    (await fromFile(site, at, nowMs));
  return 'refused' in facts ? facts : { mail: alarmMail(facts) };
}

async function fromLedger(
  site: Site,
  point: Point,
  ledger: Ledger,
  nowMs: number,
): Promise<AlarmMailFacts | null> {
  const facts = await ledger.read(async (reader) => {
    const view = await readersView(reader, site);
    return view === null ? null : asAlarm(reader, view, point, nowMs);
  });
  return facts === null || 'refused' in facts ? null : facts;
}

async function fromFile(
  site: Site,
  { machine, point }: { readonly machine: Machine; readonly point: Point },
  nowMs: number,
): Promise<AlarmMailFacts | { readonly refused: string }> {
  const drop = await lookAtDrop(site);
  if (drop.problem !== null) return { refused: drop.problem };
  const path = pointPath(point);
  const newest = drop.waiting.get(path)?.newest;
  if (newest === undefined) {
    return {
      refused: `there is no recording of ${path}, neither in the ledger nor in ${site.folders.drop}; let the logger record, or see humledger files`,
    };
  }
  const answer = await new FileLevels(site).analyse(`${site.folders.drop}/${newest}`, newest, point);
  if ('reason' in answer) return { refused: `${newest}: ${answer.reason}` };
  const measurement = answer.measurements.find(
    (one) => one.machineId === point.machineId && one.pointId === point.id,
  );
  if (measurement === undefined || measurement.levels.length === 0)
    return { refused: `${newest} gives no level of ${path}; humledger check says why` };
  const limits = limitsOfMeasured(machine, point, measurement);
  const chosen = mostUsed(limits, measurement.levels);
  if (chosen === null) return { refused: `${path}: ${whyNone(limits)}` };
  const times = { startMs: answer.start.startMs, arrivedMs: nowMs };
  return {
    site: { name: site.name, timeZone: site.timeZone },
    machine: { id: machine.id, name: machine.name, criticality: machine.criticality },
    writtenMs: nowMs,
    alarms: [alarmOf(machine, point, { ...chosen, measurement, fileName: newest, ...times })],
    troubles: [],
    threadSubject: null,
    test: true,
  };
}

interface Chosen {
  readonly level: BandLevel;
  readonly inForce: LimitInForce;
}

function mostUsed(limits: readonly LimitInForce[], levels: readonly BandLevel[]): Chosen | null {
  const used = limits.flatMap((inForce) => {
    const level = levels.find(({ bandId }) => bandId === inForce.limit.bandId);
    return level === undefined || 'unknown' in inForce.now
      ? []
      : [{ level, inForce, share: shareOfAlert(level.level, limitFactsNow(inForce)) ?? 0 }];
  });
  return used.sort((a, b) => b.share - a.share)[0] ?? null;
}

function alarmOf(
  machine: Machine,
  point: Point,
  about: Chosen & {
    readonly measurement: Measurement;
    readonly fileName: string;
    readonly startMs: number;
    readonly arrivedMs: number;
  },
): AlarmFacts {
  const { level, inForce, measurement, fileName, startMs, arrivedMs } = about;
  const { limit } = inForce;
  const facts = limitFactsNow(inForce);
  const { averaging, durationS, speed, loadPercent, quality } = measurement;
  const band = point.bands.find(({ id }) => id === limit.bandId);
  const now = { peaks: measurement.peaks, lineSpacingHz: averaging?.lineSpacingHz ?? 0 };
  return {
    kind: 'alarm',
    number: 0,
    standing: 'unacknowledged',
    sinceMs: startMs,
    recordings: 1,
    respondByMs: null,
    acknowledgedBy: null,
    acknowledgedMs: null,
    suppressedUntilMs: null,
    severity: facts.alert === null ? 'danger' : 'alert',
    event: 'raised',
    machine: { id: machine.id, name: machine.name, criticality: machine.criticality },
    point: { id: point.id, name: point.name, direction: point.direction },
    band: {
      ...bandFacts(limit.bandId, band, undefined, machine),
      fromHz: level.fromHz,
      toHz: level.toHz,
    },
    limit: facts,
    level: { ...level, usedMs: startMs },
    dangerUnconfirmed: false,
    evidence: measurement.evidence.filter(speaksForFault).map(({ grade, words }) => ({ grade, words })),
    change: null,
    action: limit.action,
    zone: zoneFacts(machine, measuredReading(machine, point, measurement), limit.bandId, null),
    before: { last: [], dayBefore: null, weekBefore: null, baseline: null },
    trend: null,
    lines: {
      display: usualDisplayUnit(point.quantity, measurement.unit),
      comparedWithMs: null,
      lines: compareLines(now, { peaks: [], lineSpacingHz: now.lineSpacingHz }),
    },
    otherPoints: [],
    recording: {
      fileName,
      startMs,
      arrivedMs,
      arrival: 'in-time',
      durationS,
      speed,
      loadPercent,
      averaging,
      quality,
    },
  };
}
