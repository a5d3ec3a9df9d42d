import type { QualityFlag } from '../acquisition/recording.ts';
import {
  type AlarmChange,
  type AlarmState,
  type AlarmSubject,
  normalState,
  type TroubleKind,
} from './alarm.ts';
import type { AlarmRule, AlarmStep } from './alarm-event.ts';
import { alarmStep, standing } from './alarm-state.ts';
import type { MachineState } from './machine-state.ts';

/**
 * Trouble: something gives no usable data. It runs in the same machine as alarms, with the one severity 'trouble'.
 * It is raised and returns by looks that are certain of their matter; a look that cannot tell is not handed in.
 */
export type TroubleSubject = Extract<AlarmSubject, { kind: 'trouble' }>;

export interface TroubleLook {
  readonly present: boolean;
  /** Used time where a recording was looked at, else the time of the look. */
  readonly usedMs: number;
  /** What was found, as data for the journal. */
  readonly reason: Readonly<Record<string, unknown>>;
}

interface TroubleNature {
  /** Looks in a row before it is raised. */
  readonly looks: number;
  /** Each look at standing trouble is one file more, to be counted; otherwise it is the same news once more. */
  readonly counts: boolean;
}

/**
 * Two looks where one recording may be a slip: a sensor that is being changed, a machine that stops between two
 * points' recordings. One where the look is sure by itself, or where the caller has counted already (repeats: the
 * second in a row is handed in).
 */
const natures: Readonly<Record<TroubleKind, TroubleNature>> = {
  overdue: { looks: 1, counts: false },
  'dead-sensor': { looks: 2, counts: true },
  'reads-stopped': { looks: 2, counts: true },
  unreadable: { looks: 1, counts: true },
  unassigned: { looks: 1, counts: true },
  'wrong-rate': { looks: 1, counts: true },
  'uneven-time': { looks: 1, counts: true },
  'repeats-itself': { looks: 1, counts: true },
  clock: { looks: 1, counts: true },
  'late-sidecar': { looks: 1, counts: true },
  'drop-folder': { looks: 1, counts: false },
  ledger: { looks: 1, counts: false },
  'mail-refused': { looks: 1, counts: false },
  'site-file': { looks: 1, counts: false },
};

/** Whether its count is one of files; otherwise it only stands. */
export function countsFiles(kind: TroubleKind): boolean {
  return natures[kind].counts;
}

export function troubleRule(kind: TroubleKind): AlarmRule {
  return {
    side: 'upper',
    onDelay: { recordings: natures[kind].looks },
    offDelay: { recordings: 1 },
    latching: false,
    sayAgainPercent: null,
  };
}

/**
 * One look at one trouble.
 *
 * @returns null where nothing is to be stored: it was not there and is not there, or it stands and nothing is counted
 */
export function troubleStep(
  subject: TroubleSubject,
  earlier: AlarmState | undefined,
  look: TroubleLook,
): AlarmChange | null {
  const before = earlier ?? normalState;
  if (look.present && before.condition === 'trouble' && !natures[subject.trouble].counts) return null;
  const step = alarmStep(
    before,
    {
      kind: 'judged',
      severity: look.present ? 'trouble' : 'normal',
      usedMs: look.usedMs,
      level: null,
      flagged: false,
      atOnce: false,
      reason: look.reason,
    },
    troubleRule(subject.trouble),
  );
  return changeOf(subject, before, step);
}

/**
 * Trouble that has returned to normal and was told in a summary needs no hand any more: it is acknowledged by that
 * (D -> A "automatic", as ANSI/ISA-18.2-2016 leaves to the site's philosophy). Otherwise each night's unreadable file
 * would leave one more line for somebody to tick off. Alarms of limits are never acknowledged this way.
 *
 * @returns null where the trouble still stands, is acknowledged, or lies under a suppression
 */
export function troubleToldInSummary(subject: TroubleSubject, state: AlarmState): AlarmChange | null {
  if (standing(state) !== 'returned-unacknowledged') return null;
  const step = alarmStep(
    state,
    {
      kind: 'acknowledge',
      comment: 'told in the summary after it had returned',
      reason: { automatic: true },
    },
    troubleRule(subject.trouble),
  );
  return changeOf(subject, state, step);
}

/** What a step wants stored and told; null when it changes nothing. */
export function changeOf(subject: AlarmSubject, before: AlarmState, step: AlarmStep): AlarmChange | null {
  if (step.state === before && step.journal.length === 0) return null;
  return { subject, state: step.state, journal: step.journal, tell: step.tell };
}

/**
 * Flags that mean: this is not the machine. A broken cable is noise or mains hum, not only a flat line. Left out:
 * `clipped` (loud, the level reads 'at least'), `dropouts` (a loose contact still sends; its levels are kept and
 * flagged), `settling`, `ski-slope` and `unsteady` (doubtful numbers from a living sensor).
 */
const deadFlags: readonly QualityFlag[] = [
  'flat',
  'saturated',
  'bias-out-of-range',
  'hum-only',
  'low-signal',
];

/** These say it of a standing machine too; silence, hum and a flat line are what a standing machine sounds like. */
const deadEvenStopped: readonly QualityFlag[] = ['saturated', 'bias-out-of-range'];

export interface SensorLook {
  readonly present: boolean;
  readonly flags: readonly QualityFlag[];
}

/**
 * Whether a recording shows a dead sensor, and by which flags.
 *
 * @param hasWaveform the recording was long enough for waveform values
 * @returns null where it cannot be told: nothing was analysed, or the machine stands still and nothing gives it away
 */
export function looksDead(
  flags: readonly QualityFlag[],
  machine: MachineState,
  hasWaveform: boolean,
): SensorLook | null {
  const telling = machine === 'stopped' ? deadEvenStopped : deadFlags;
  const found = flags.filter((flag) => telling.includes(flag));
  if (found.length > 0) return { present: true, flags: found };
  return machine === 'stopped' || !hasWaveform ? null : { present: false, flags: [] };
}
