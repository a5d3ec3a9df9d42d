import type { TroubleFacts } from '../advisory/facts.ts';
import type { JournalEventName } from '../detection/alarm.ts';
import { countsFiles, type TroubleSubject } from '../detection/trouble.ts';
import type { StandingLife } from '../store/alarms.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import { lastUnflaggedMs } from '../store/past-levels.ts';
import { arrivalsOf, findSource } from '../store/sources.ts';
import { machineFacts, pointFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';
import { standingFacts } from './standing-facts.ts';

/** What a mail or the summary says of one trouble. */
export async function troubleFacts(
  reader: Reader,
  view: SiteView,
  of: StandingLife,
  event: JournalEventName,
): Promise<TroubleFacts> {
  const subject = of.alarm.subject as TroubleSubject;
  const { machineId, pointId, trouble } = subject;
  const point = machineId === null ? undefined : view.point(`${machineId}/${pointId}`);
  const shared = await standingFacts(reader, of, { askedMs: null, respondWithinMs: null });
  return {
    ...shared,
    recordings: countsFiles(trouble) ? shared.recordings : 0,
    kind: 'trouble',
    trouble,
    machine: machineId === null ? null : machineFacts(view, machineId),
    point: machineId === null || pointId === null ? null : pointFacts(view, machineId, pointId),
    source: subject.source,
    detail: await detailOf(reader, of.life.number),
    lastGoodMs: await lastGood(reader, subject, of, shared.sinceMs),
    expectedEveryMs: trouble === 'overdue' ? (point?.recordings.expectedEveryMs ?? null) : null,
    event,
  };
}

/** One line from the reason that was journalled when it was raised. */
async function detailOf(reader: Reader, number: number): Promise<string | null> {
  const rows = await readJournal(reader, { number, limit: 100 });
  const reason = rows.find(({ event }) => event === 'raised')?.reason ?? {};
  const texts = (value: unknown): string[] =>
    Array.isArray(value) ? value.flatMap(texts) : typeof value === 'string' && value !== '' ? [value] : [];
  const found = [...texts(reason.detail), ...texts(reason.details)];
  // A refusal names its file by itself.
  const file = texts(reason.file).filter(
    (path) => !found.some((text) => text.startsWith(path.slice(path.lastIndexOf('/') + 1))),
  );
  const said = [...file, ...found];
  if (said.length === 0) said.push(...texts(reason.flags));
  return said.length === 0 ? null : said.join(': ');
}

/** Overdue counts what came at all; a sensor, its last recording without a flag; a logger, what was evaluated. */
async function lastGood(
  reader: Reader,
  subject: TroubleSubject,
  { alarm }: StandingLife,
  sinceMs: number,
): Promise<number | null> {
  if (alarm.pointId !== null) {
    if (subject.trouble !== 'overdue') return lastUnflaggedMs(reader, alarm.pointId, sinceMs);
    return (await arrivalsOf(reader, [alarm.pointId])).get(alarm.pointId)?.lastArrivedMs ?? null;
  }
  if (subject.source === null) return null;
  return (await findSource(reader, subject.source))?.lastEvaluatedArrivedMs ?? null;
}
