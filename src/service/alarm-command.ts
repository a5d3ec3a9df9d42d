import { printDuration } from '../config/print-value.ts';
import type { AlarmStanding, AlarmSubject } from '../detection/alarm.ts';
import type { AlarmCommand } from '../detection/alarm-event.ts';
import { alarmStep, standing } from '../detection/alarm-state.ts';
import { ruleOfCommands } from '../detection/suppression.ts';
import { changeOf } from '../detection/trouble.ts';
import { alarmByNumber, type StandingLife } from '../store/alarms.ts';
import type { Via } from '../store/journal.ts';
import type { Writer } from '../store/lent-connection.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { readSiteIds } from '../store/site-ids.ts';
import { setShelf } from '../store/suppressions.ts';

/** Who did it, how it came, when by the wall clock. */
export interface Person {
  readonly by: string;
  readonly via: Extract<Via, 'command' | 'page' | 'link'>;
  readonly wallMs: number;
}

/** What a person does to one alarm. A shelf asks for a reason and an end. */
export type AlarmOrder =
  | { readonly kind: 'acknowledge' | 'reset' | 'unshelve'; readonly comment: string | null }
  | {
      readonly kind: 'shelve';
      readonly comment: string;
      readonly forMs: number;
      /** The site's longest shelf. */
      readonly atMostMs: number;
    };

/** `refused`: why nothing was changed, for people. */
export type CommandAnswer =
  | {
      readonly subject: AlarmSubject;
      readonly before: AlarmStanding;
      readonly after: AlarmStanding;
      /** End of a shelf that was begun. */
      readonly untilMs?: number;
    }
  | { readonly refused: string };

/**
 * What a person does to the alarm of that number, inside one transaction: read, decided, journalled and stored there,
 * so that a recording that comes at the same moment is judged before or after it, never beside it.
 */
export async function commandAlarm(
  writer: Writer,
  number: number,
  order: AlarmOrder,
  person: Person,
): Promise<CommandAnswer> {
  const found = await alarmByNumber(writer, number);
  if (found === null) return { refused: `there is no alarm or trouble number ${number}` };
  const { alarm, life } = found;
  const over = overText(found, order.kind);
  if (over !== null) return { refused: over };
  if (order.kind === 'shelve' && order.forMs > order.atMostMs)
    return {
      refused: `an alarm can be shelved for at most ${printDuration(order.atMostMs)} (shelve_at_most)`,
    };
  const ids = await readSiteIds(writer);
  if (ids === null) throw new Error(`number ${number} stands in a ledger that knows no site file`);
  const untilMs = order.kind === 'shelve' ? person.wallMs + Math.round(order.forMs) : null;
  const step = alarmStep(alarm.state, full(order, person, untilMs), ruleOfCommands);
  const change = changeOf(alarm.subject, alarm.state, step);
  if (change === null) {
    const by = alarm.state.acknowledged && order.kind === 'acknowledge' ? `, by ${life.acknowledgedBy}` : '';
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
  const answer = { subject: alarm.subject, before: standing(alarm.state), after: standing(step.state) };
  if (untilMs === null) return answer;
  const { by, wallMs: sinceMs } = person;
  await setShelf(writer, alarm.key, { sinceMs, untilMs, by, comment: order.comment });
  return { ...answer, untilMs };
}

/**
 * A life that is over cannot be acknowledged or reset. Its alarm can be shelved by the number that people know it by (it
 * may come and go), and let off the shelf; where a later life stands, that one's number is asked for.
 */
function overText({ alarm, life }: StandingLife, kind: AlarmOrder['kind']): string | null {
  const { number } = life;
  if (life.endedWallMs === null && alarm.number === number) return null;
  const later = alarm.number !== number && alarm.state.highest !== null;
  if (!later && (kind === 'shelve' || kind === 'unshelve')) return null;
  const now = later ? `; it stands again as number ${alarm.number}` : '';
  return `number ${number} does not stand any more: it is over${now}`;
}

function full({ kind, comment }: AlarmOrder, { by }: Person, untilMs: number | null): AlarmCommand {
  return { kind, comment, reason: untilMs === null ? {} : { untilMs, by } };
}
