import { join } from 'node:path';
import { type AlarmSubject, type JournalEventName, subjectKey } from '../detection/alarm.ts';
import { readMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { appendLines, readLines } from '../store/line-log.ts';
import { type AlarmOrder, type CommandAnswer, commandAlarm, type Person } from './alarm-command.ts';

/**
 * What people did to alarms and machines, one line each, beside the ledger and forced to the disk: `data/acts.log`. A
 * ledger that was put back from a backup lacks the acts since then. They are named in the log and in the mail of the
 * start, never done again: whoever acknowledged took something in hand, and only he knows whether he still does.
 */
export interface Act {
  readonly wallMs: number;
  readonly by: string;
  /** What was done, as people type it: 'acknowledge 12', 'note blower-1 repair'. */
  readonly command: string;
  /** How the journal names it. */
  readonly event: JournalEventName;
  /** Key of the alarm; null where it is about a machine or a point. */
  readonly key: string | null;
  readonly comment: string | null;
}

/** Byte of the log up to which acts were compared with the ledger. */
export const actsMark = 'acts-compared-bytes';
const mostBytes = 4 * 1024 * 1024;

/** The answer of `commandAlarm`; `note`: it is done, but could not be written down beside the ledger. */
export type ActAnswer = CommandAnswer & { readonly note?: string };

const eventOf = {
  acknowledge: 'acknowledged',
  reset: 'reset',
  shelve: 'shelved',
  unshelve: 'unshelved',
} as const satisfies Readonly<Record<AlarmOrder['kind'], JournalEventName>>;

/** What a person does to an alarm: one transaction, then its line. */
export async function actOnAlarm(
  ledger: Ledger,
  number: number,
  order: AlarmOrder,
  person: Person,
): Promise<ActAnswer> {
  const answer = await ledger.transact((writer) => commandAlarm(writer, number, order, person));
  if ('refused' in answer) return answer;
  const note = writeAct(ledger, person, {
    command: `${order.kind} ${number}`,
    event: eventOf[order.kind],
    key: subjectKey(answer.subject as AlarmSubject),
    comment: order.comment,
  });
  return note === null ? answer : { ...answer, note };
}

/** Writes the line of an act that the ledger has taken; the answer is what went wrong, for people. */
export function writeAct(
  ledger: Ledger,
  { by, wallMs }: Person,
  act: Omit<Act, 'wallMs' | 'by'>,
): string | null {
  try {
    const line: Act = { wallMs, by, ...act };
    appendLines(join(ledger.folder, 'acts.log'), [line]);
    return null;
  } catch (error) {
    return `it stands in the ledger, but not in acts.log: ${(error as Error).message}`;
  }
}

/** Acts that the log has and the journal has not, oldest first; and the byte up to which was compared, null: as before. */
export async function lostActs(
  ledger: Ledger,
): Promise<{ readonly acts: readonly Act[]; readonly mark: string | null }> {
  const from = Number((await ledger.read((reader) => readMark(reader, actsMark))) ?? 0);
  const { lines, size } = readLines(join(ledger.folder, 'acts.log'), from, mostBytes);
  const acts: Act[] = [];
  for (const line of lines) {
    if (isAct(line) && !(await ledger.read((reader) => isInJournal(reader, line)))) acts.push(line);
  }
  return { acts, mark: size === from ? null : String(size) };
}

async function isInJournal(reader: Reader, act: Act): Promise<boolean> {
  const row = await reader
    .selectFrom('journal')
    .select('sequence')
    .where('key', act.key === null ? 'is' : '=', act.key)
    .where('event', '=', act.event)
    .where('wall_ms', '=', act.wallMs)
    .where('actor', '=', act.by)
    .executeTakeFirst();
  return row !== undefined;
}

function isAct(value: unknown): value is Act {
  if (typeof value !== 'object' || value === null) return false;
  const { wallMs, by, command, event, key } = value as Record<string, unknown>;
  return (
    Number.isFinite(wallMs) &&
    typeof by === 'string' &&
    typeof command === 'string' &&
    typeof event === 'string' &&
    (key === null || typeof key === 'string')
  );
}
