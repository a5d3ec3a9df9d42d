import { type QualityFlag, qualityFlags } from '../../src/acquisition/recording.ts';
import { loadSite } from '../../src/config/load.ts';
import type { Delay, Limit, RunningRule } from '../../src/config/site.ts';
import type { BandLevel, Measurement } from '../../src/manipulation/measurement.ts';
import { runningSpeed } from '../../src/manipulation/running-speed.ts';
import { hourMs, levelOf, limitWith, measurementWith } from '../detection/site-parts.ts';

/** The words of alarm-scenario.ts, as parts of a recording, a limit, a running rule. */
export function measurementOf(parts: readonly string[]): Measurement {
  let level: Partial<BandLevel> = {};
  const more: { -readonly [K in 'speed' | 'runningSaid' | 'waveform']?: Measurement[K] } = {};
  const flags: QualityFlag[] = [];
  let averages = 31;
  for (const part of parts) {
    const number = Number(/[\d.]+(?!.*\d)/.exec(part)?.[0]);
    const flag = qualityFlags.find((one) => part === `flag ${one}`);
    if (part.startsWith('level ')) level = { ...level, level: number };
    else if (part.startsWith('interval ')) {
      const [low, high] = part.slice(9).split(' to ').map(Number);
      level = { ...level, intervalLow: low, intervalHigh: high };
    } else if (part.startsWith('80 % over ')) level = { ...level, exceededBy80Percent: number };
    else if (part.startsWith('averages ')) averages = number;
    else if (part === 'at least') level = { ...level, atLeast: true };
    else if (part.startsWith('speed '))
      more.speed = runningSpeed({ sidecarRpm: number, nominalHz: null }).speed;
    else if (part.startsWith('said ')) more.runningSaid = part === 'said running';
    else if (part === 'too short') more.waveform = null;
    else if (flag !== undefined) flags.push(flag);
    else throw new Error(`no such part of a recording: ${part}`);
  }
  const levels = level.level === undefined ? [] : [levelOf(level.level, level)];
  return measurementWith({ levels, flags, averages, ...more });
}

export function limitOf(parts: readonly string[]): Limit {
  let limit = limitWith({ alert: null, danger: null, deadbandPercent: 0 });
  for (const part of parts) {
    const zone = /^zone for (\d+) kW (rigid|flexible)(?: with baseline ([\d.]+))?$/.exec(part);
    if (zone !== null) {
      limit = { ...limit, ...zoneLimit(zone[1] ?? '', zone[2] ?? '', zone[3] ?? null) };
      continue;
    }
    const ruled = ruledLimit(part);
    if (ruled !== null) {
      limit = { ...limit, ...ruled };
      continue;
    }
    const [, key, number, unit] = /^([a-z -]+?)(?: ([\d.]+) ?(\S+)?)?$/.exec(part) ?? [];
    const value = Number(number);
    const delay: Delay = unit?.startsWith('recording') ? { recordings: value } : { ms: value * hourMs };
    const found: Partial<Limit> | undefined = {
      alert: { alert: value },
      danger: { danger: value },
      'on-delay': { onDelay: delay },
      'off-delay': { offDelay: delay },
      deadband: { deadbandPercent: value },
      'say again at': { sayAgainPercent: value },
      latching: { latching: true },
      lower: { side: 'lower' as const },
    }[key ?? ''];
    if (found === undefined) throw new Error(`no such part of a limit: ${part}`);
    limit = { ...limit, ...found };
  }
  return limit;
}

/** Kinds whose values are learned, confidence, operating conditions; null where the part says none of them. */
function ruledLimit(part: string): Partial<Limit> | null {
  const spreads = /^([\d.]+) spreads$/.exec(part);
  const multiple = /^([\d.]+) times what is usual$/.exec(part);
  const change = /^change ([\d.]+)$/.exec(part);
  const conditions = /^in (\S+)$/.exec(part);
  if (part === 'statistical')
    return { kind: 'statistical', rule: { by: 'spread', alert: 4.5, danger: null } };
  if (spreads !== null) return { rule: { by: 'spread', alert: Number(spreads[1]), danger: null } };
  if (multiple !== null)
    return { kind: 'baseline', rule: { by: 'baseline', alert: Number(multiple[1]), danger: null } };
  if (change !== null) return { kind: 'change', rule: { by: 'change', alert: Number(change[1]) } };
  if (part === 'with confidence') return { confident: true };
  return conditions === null ? null : { conditions: [conditions[1] ?? ''] };
}

/** Out of a site file with a limit of kind zone, as the program reads it; here in mm/s like all levels of a story. */
function zoneLimit(kw: string, support: string, baseline: string | null): Partial<Limit> {
  const text = `site: Larkfen Waterworks
time_zone: Europe/Dublin
folders:
  drop: ./drop
  data: ./data
machines:
  - id: blower-1
    running_speed: 2970 rpm
    zones:
      standard: iso-20816-3
      power: ${kw} kW
      support: ${support}
    points:
      - id: de-h
        quantity: velocity
        recordings:
          files: <any>.wav
          samples_in: mm/s
        bands:
          - id: overall
            from: 10 Hz
            to: 1000 Hz
        limits:
          - band: overall
            kind: zone
${baseline === null ? '' : `            baseline: ${baseline} mm/s\n`}`;
  const answer = loadSite(text, '/srv/plant/site.yaml');
  if (!answer.ok) throw new Error(answer.problems.map(({ what }) => what).join('; '));
  const {
    id,
    kind,
    alert = null,
    danger = null,
    reasons = null,
  } = answer.site.machines[0]?.points[0]?.limits[0] ?? {};
  if (id === undefined || kind === undefined) throw new Error('the site file gave no limit');
  const inMm = (value: number | null) => (value === null ? null : Number((value * 1000).toPrecision(12)));
  return { id, kind, alert: inMm(alert), danger: inMm(danger), reasons };
}

export function ruleOf(text: string): RunningRule {
  const number = Number(/[\d.]+/.exec(text)?.[0]);
  if (text.startsWith('speed')) return { by: 'speed', aboveRpm: number };
  return text === 'sidecar' ? { by: 'sidecar' } : { by: 'level', bandId: 'overall', above: number };
}
