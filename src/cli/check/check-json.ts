import type { LimitFacts } from '../../advisory/facts.ts';
import { shareOfAlert } from '../../advisory/ranking.ts';
import { type MachineZones, zonesName } from '../../config/machine-zones.ts';
import type { Machine } from '../../config/site.ts';
import { limitFactsNow } from '../../service/limits-in-force.ts';
import { bareUnit, levelJson, limitJson } from '../level-json.ts';
import { limitFactsJson } from '../limit-json.ts';
import { adviceJson, reachJson } from '../recording-plan/plan-json.ts';
import { envelopeCheckJson } from './envelope-check.ts';
import { type PartCheck, partChecks } from './part-check.ts';
import { type BandCheck, canAlarm, type LevelNow, type PointCheck } from './point-check.ts';
import type { SiteCheck } from './site-check.ts';
import { type ZoneCheck, zoneCheck } from './zone-check.ts';

/** The same for programs: full precision, display units. */
export function checkJson(check: SiteCheck): Record<string, unknown> {
  const { site, retired, drop } = check;
  return {
    site: site.name,
    file: site.file,
    config_version: site.configVersion,
    ready: check.hindrances.length === 0,
    missing: [...check.hindrances, ...check.lacks],
    counts: {
      points: check.points.length,
      limits: check.limits,
      limits_not_reckoned: check.notReckoned,
      recipients: check.recipients.length,
    },
    machines: site.machines.map((machine) => ({
      machine: machine.id,
      name: machine.name,
      zones: zonesJson(machine.zones ?? null),
      parts: partChecks(machine).map(partJson),
      points: check.points
        .filter(({ point }) => point.machineId === machine.id)
        .map((one) => pointJson(machine, one)),
    })),
    warnings: [
      ...check.remarks.map((text) => ({ line: null, column: null, text })),
      ...site.warnings.map(({ line, column, text }) => ({ line, column, text })),
    ],
    unassigned: drop.unassigned.slice(0, 100),
    unassigned_count: drop.unassigned.length,
    would_retire: {
      machines: retired.machines,
      points: retired.points,
      bands: retired.bands,
      limits: retired.limits,
      alarms_closed: retired.alarms,
    },
  };
}

function partJson({ part, frequencies, points }: PartCheck) {
  return {
    part: part.id,
    name: part.name,
    kind: part.kind,
    frequencies: frequencies.map(({ one, hz }) => ({ frequency: one.kind, of: one.of, hz })),
    points: points.map(({ point, spectrum, lineSpacingHz, notJudged, notSeparable }) => ({
      point,
      spectrum,
      line_spacing_hz: lineSpacingHz,
      not_separable: notSeparable.map(({ frequency, harmonic, neededHz }) => ({
        frequency,
        harmonic,
        line_spacing_needed_hz: neededHz,
      })),
      not_judged: notJudged.map(({ what, neededHz }) => ({ what, line_spacing_needed_hz: neededHz })),
    })),
  };
}

function pointJson(machine: Machine, check: PointCheck) {
  const zones = zoneCheck(machine, check);
  const { point, waiting, ledger, averaging, usedMs } = check;
  const iso = (ms: number | null) => (ms === null ? null : new Date(ms).toISOString());
  return {
    point: point.id,
    name: point.name,
    can_alarm: canAlarm(check),
    files_in_drop: waiting?.files ?? 0,
    files_in_archive: ledger?.archived.count ?? 0,
    recordings_in_ledger: ledger?.recordings ?? 0,
    newest_in_ledger: iso(ledger?.newestUsedMs ?? null),
    levels_from: check.from,
    recording_start: iso(usedMs),
    remark: check.remark,
    averaging: averaging && {
      from: averaging.from === 'recording' ? 'recording' : 'site-file',
      window: averaging.window,
      overlap_percent: averaging.overlapPercent,
      sample_rate_hz: averaging.sampleRateHz,
      segment_samples: averaging.segmentSamples,
      line_spacing_hz: averaging.lineSpacingHz,
      averages: averaging.averages,
      effective_averages: averaging.effectiveAverages,
      used_percent: averaging.usedPercent,
    },
    envelope: envelopeCheckJson(check),
    shows: check.advice && reachJson(check.advice.reach, []),
    cannot_show: check.advice === null ? [] : check.advice.cannot.map(adviceJson),
    bands: check.bands.map((band) => ({ ...bandJson(band), zone: zoneJson(zones, band) })),
    quality: check.quality.map(({ flag, detail }) => ({ flag, detail })),
  };
}

function bandJson({ band, now, limits, judged }: BandCheck) {
  return {
    band: band.id,
    quantity: band.quantity,
    level: now && {
      ...levelJson(now, band.display),
      confidence_percent: now.confidencePercent,
      at_least: now.atLeast,
    },
    limits: limits.map((inForce) => {
      const facts = limitFactsNow(inForce);
      return {
        limit: facts.id,
        kind: inForce.limit.kind,
        ...limitFactsJson(facts, band.display),
        share_of_alert: shareOf(facts, facts.alert, judged ? now : null),
        share_of_danger: shareOf(facts, facts.danger, judged ? now : null),
      };
    }),
  };
}

function zonesJson(zones: MachineZones | null) {
  return (
    zones && {
      standard: zones.standard,
      table: zonesName(zones),
      outside: zones.outside,
      boundaries: zones.boundaries.map(({ quantity, display, ab, bc, cd, known, source }) => ({
        quantity,
        unit: bareUnit(display),
        detector: display.detector,
        a_b: limitJson(ab, display),
        b_c: limitJson(bc, display),
        c_d: limitJson(cd, display),
        from_memory: known === 'memory',
        source,
      })),
    }
  );
}

/** Null where the machine has no zones, or the band is of nothing that a table judges. */
function zoneJson(check: ZoneCheck | null, { band }: BandCheck) {
  const answer = check?.bands.get(band.id);
  if (answer === undefined) return null;
  if (answer.letter === null) return { zone: null, why: answer.why, at_least: false };
  return { zone: answer.letter, why: null, at_least: answer.atLeast };
}

/** 1 at the limit; null without a level or a limit, or beyond all numbers. */
function shareOf(limit: LimitFacts, at: number | null, now: LevelNow | null): number | null {
  if (at === null || now === null) return null;
  const share = shareOfAlert(now.level, { ...limit, alert: at, danger: null });
  return share === null || !Number.isFinite(share) ? null : share;
}
