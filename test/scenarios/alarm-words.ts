import { type QualityFlag, qualityFlags } from '../../src/acquisition/recording.ts';
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
    else if (part.startsWith('80 % over ')) level = { ...level, exceededBy80Percent: number };
    else if (part.startsWith('averages ')) averages = number;
    else if (part === 'at least') level = { ...level, atLeast: true };
    else if (part.startsWith('speed ')) more.speed = runningSpeed({ sidecarRpm: number, nominalHz: null });
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

export function ruleOf(text: string): RunningRule {
  const number = Number(/[\d.]+/.exec(text)?.[0]);
  if (text.startsWith('speed')) return { by: 'speed', aboveRpm: number };
  return text === 'sidecar' ? { by: 'sidecar' } : { by: 'level', bandId: 'overall', above: number };
}
