import type { AlarmStanding, AlarmSubject } from '../detection/alarm.ts';
import type { AlarmCommand, AlarmRule } from '../detection/alarm-event.ts';
import { alarmStep, standing } from '../detection/alarm-state.ts';
import { changeOf, troubleRule } from '../detection/trouble.ts';
import { alarmByNumber } from '../store/alarms.ts';
import type { Via } from '../store/journal.ts';
import type { Writer } from '../store/lent-connection.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { readSiteIds } from '../store/site-ids.ts';

/** Who did it, how it came, when by the wall clock. */
export interface Person {
  readonly by: string;
  readonly via: Extract<Via, 'command' | 'page' | 'link'>;
  readonly wallMs: number;
}

/** `refused`: why nothing was changed, for people. */
export type CommandAnswer =
  | {
      readonly subject: AlarmSubject;
      readonly before: AlarmStanding;
      readonly after: AlarmStanding;
    }
  | { readonly refused: string };

/**
 * What a person does to the alarm of that number, inside one transaction: read, decided, journalled and stored there,
 * so that a recording that comes at the same moment is judged before or after it, never beside it.
 */
export async function commandAlarm(
  writer: Writer,
  number: number,
  command: { readonly kind: 'acknowledge' | 'reset'; readonly comment: string | null },
  person: Person,
): Promise<CommandAnswer> {
  const found = await alarmByNumber(writer, number);
  if (found === null) return { refused: `there is no alarm or trouble number ${number}` };
  const { alarm, life } = found;
  if (life.endedWallMs !== null || alarm.number !== number)
    return { refused: `number ${number} does not stand any more: it is over` };
  const ids = await readSiteIds(writer);
  if (ids === null) throw new Error(`number ${number} stands in a ledger that knows no site file`);
  const step = alarmStep(alarm.state, full(command), ruleOf(alarm.subject));
  const change = changeOf(alarm.subject, alarm.state, step);
  if (change === null) {
    const by =
      alarm.state.acknowledged && command.kind === 'acknowledge' ? `, by ${life.acknowledgedBy}` : '';
    return { refused: `number ${number}: ${step.ignored ?? 'nothing to change'}${by}` };
  }
  await saveAlarmChange(writer, change, {
    ids,
    wallMs: person.wallMs,
    recordingId: null,
    actor: person.by,
    via: person.via,
    fromBacklog: false,
  });
  return { subject: alarm.subject, before: standing(alarm.state), after: standing(step.state) };
}

function full({ kind, comment }: { kind: 'acknowledge' | 'reset'; comment: string | null }): AlarmCommand {
  return { kind, comment, reason: {} };
}

/** The rule of a limit governs what recordings do to its alarm; what people do is the same for all. */
const ruleOfPeople: AlarmRule = {
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching: false,
  sayAgainPercent: null,
};

function ruleOf(subject: AlarmSubject): AlarmRule {
  return subject.kind === 'trouble' ? troubleRule(subject.trouble) : ruleOfPeople;
}
