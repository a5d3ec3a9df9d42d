import { join } from 'node:path';
import type { AlarmSubject } from '../detection/alarm.ts';
import { subjectKey } from '../detection/alarm.ts';
import { readMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader } from '../store/lent-connection.ts';
import { appendLines, readLines } from '../store/line-log.ts';
import { type CommandAnswer, commandAlarm, type Person } from './alarm-command.ts';

/**
 * What people did to alarms, one line each, beside the ledger and forced to the disk: `data/acts.log`. A ledger that was
 * put back from a backup lacks the acts since then. They are named in the log and in the mail of the start, never done
 * again: whoever acknowledged took something in hand, and only he knows whether he still does.
 */
export interface Act {
  readonly wallMs: number;
  readonly by: string;
  readonly command: 'acknowledge' | 'reset';
  readonly number: number;
  readonly key: string;
  readonly comment: string | null;
}

/** Byte of the log up to which acts were compared with the ledger. */
export const actsMark = 'acts-compared-bytes';
const mostBytes = 4 * 1024 * 1024;

/** The answer of `commandAlarm`; `note`: it is done, but could not be written down beside the ledger. */
export type ActAnswer = CommandAnswer & { readonly note?: string };

/** What a person does to an alarm: one transaction, then its line. */
export async function actOnAlarm(
  ledger: Ledger,
  number: number,
  command: { readonly kind: Act['command']; readonly comment: string | null },
  person: Person,
): Promise<ActAnswer> {
  const answer = await ledger.transact((writer) => commandAlarm(writer, number, command, person));
  if ('refused' in answer) return answer;
  const { by, wallMs } = person;
  const key = subjectKey(answer.subject as AlarmSubject);
  const act: Act = { wallMs, by, command: command.kind, number, key, comment: command.comment };
  try {
    appendLines(join(ledger.folder, 'acts.log'), [act]);
    return answer;
  } catch (error) {
    return { ...answer, note: `it stands in the ledger, but not in acts.log: ${(error as Error).message}` };
  }
}

const eventOf = { acknowledge: 'acknowledged', reset: 'reset' } as const;

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
    .where('key', '=', act.key)
    .where('event', '=', eventOf[act.command])
    .where('wall_ms', '=', act.wallMs)
    .where('actor', '=', act.by)
    .executeTakeFirst();
  return row !== undefined;
}

function isAct(value: unknown): value is Act {
  if (typeof value !== 'object' || value === null) return false;
  const { wallMs, by, command, number, key } = value as Record<string, unknown>;
  return (
    Number.isFinite(wallMs) &&
    Number.isFinite(number) &&
    typeof by === 'string' &&
    typeof key === 'string' &&
    (command === 'acknowledge' || command === 'reset')
  );
}
