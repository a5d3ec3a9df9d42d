import type { Machine, Point } from '../config/site.ts';
import { pointPath } from '../config/site.ts';
import type { JournalEventName } from '../detection/alarm.ts';
import { noBaseline } from '../detection/baseline.ts';
import { baselinesOf, type StoredBaseline, saveBaseline } from '../store/baselines.ts';
import { appendJournal } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Writer } from '../store/lent-connection.ts';
import { breakingKinds, insertNote, type NoteKind } from '../store/notes.ts';
import { readSiteIds, type SiteIds } from '../store/site-ids.ts';
import { writeAct } from './acts-log.ts';
import type { Person } from './alarm-command.ts';

/**
 * What people do to a machine or one of its points, not to an alarm: notes, and orders about baselines. One transaction
 * each, with its row in the journal; then its line beside the ledger.
 */
/** Why nothing can be done to a place. */
export const siteFileUnknown =
  'the ledger does not know this site file yet: start the service, or have it read the file (SIGHUP)';

export interface Place {
  readonly machine: Machine;
  /** Null: the machine with all its points. */
  readonly point: Point | null;
}

export interface NoteToAdd {
  readonly kind: NoteKind;
  /** Used time from which it holds. */
  readonly atMs: number;
  /** What was found. */
  readonly found: string | null;
  readonly comment: string | null;
}

export interface PlaceAnswer {
  /** Baselines that were touched. */
  readonly baselines: number;
  /** It is done, but could not be written down beside the ledger. */
  readonly note: string | null;
}

/** A note. After a repair or another sensor, levels are another machine's: baselines begin anew at that time. */
export async function addNote(
  ledger: Ledger,
  place: Place,
  note: NoteToAdd,
  person: Person,
): Promise<PlaceAnswer | { readonly refused: string }> {
  const breaks = breakingKinds.includes(note.kind);
  const baselines = await ledger.transact(async (writer) => {
    const ids = await readSiteIds(writer);
    if (ids === null) return null;
    const { machine, point } = place;
    await insertNote(writer, {
      machineId: ids.machineId(machine.id),
      pointId: point === null ? null : ids.pointId(machine.id, point.id),
      kind: note.kind,
      atMs: note.atMs,
      wallMs: person.wallMs,
      found: note.found,
      by: person.by,
      comment: note.comment,
    });
    await journalPlace(writer, ids, place, person, {
      event: 'note',
      comment: note.comment,
      usedMs: note.atMs,
      reason: { note: note.kind, found: note.found },
    });
    return breaks ? learnAgain(writer, ids, place, note.atMs) : 0;
  });
  if (baselines === null) return { refused: siteFileUnknown };
  const line = { command: `note ${pathOf(place)} ${note.kind}`, event: 'note', key: null } as const;
  return { baselines, note: writeAct(ledger, person, { ...line, comment: note.comment }) };
}

export type BaselineOrder =
  | { readonly kind: 'learn-again'; readonly fromMs: number }
  | { readonly kind: 'freeze' }
  | { readonly kind: 'confirm' };

const orders: Readonly<Record<BaselineOrder['kind'], JournalEventName>> = {
  'learn-again': 'baseline-begun-again',
  freeze: 'baseline-frozen',
  confirm: 'baseline-confirmed',
};

/** Has baselines learned again, frozen as they are, or a refused one stand by a person's word. */
export async function orderBaseline(
  ledger: Ledger,
  place: Place,
  order: BaselineOrder,
  person: Person & { readonly comment: string },
): Promise<PlaceAnswer | { readonly refused: string }> {
  const touched = await ledger.transact(async (writer) => {
    const ids = await readSiteIds(writer);
    if (ids === null) return null;
    const count =
      order.kind === 'learn-again'
        ? await learnAgain(writer, ids, place, order.fromMs)
        : await standBy(writer, ids, place, order.kind, person);
    if (count === 0) return 0;
    const { comment } = person;
    const usedMs = order.kind === 'learn-again' ? order.fromMs : null;
    await journalPlace(writer, ids, place, person, {
      event: orders[order.kind],
      comment,
      usedMs,
      reason: { baselines: count },
    });
    return count;
  });
  if (touched === null) return { refused: siteFileUnknown };
  if (touched === 0) return { refused: nothingTo[order.kind] };
  const line = { command: `baseline ${pathOf(place)} --${order.kind}`, event: orders[order.kind], key: null };
  return { baselines: touched, note: writeAct(ledger, person, { ...line, comment: person.comment }) };
}

const nothingTo: Readonly<Record<BaselineOrder['kind'], string>> = {
  'learn-again': 'there is no baseline to learn again: the first begins when a running day is over',
  freeze: 'there is no baseline to freeze: it has seen no running day yet, or is frozen already',
  confirm: 'there is no refused baseline to confirm',
};

/** All baselines of the place, learned from a time on; returns how many. One that is begun later minds the notes. */
export async function learnAgain(
  writer: Writer,
  ids: SiteIds,
  place: Place,
  fromMs: number,
): Promise<number> {
  const known = await baselinesOf(writer, await seriesOf(writer, ids, place));
  const learnFromMs = Math.round(fromMs);
  for (const { seriesId, conditionId } of known)
    await saveBaseline(writer, { ...noBaseline, seriesId, conditionId, learnFromMs });
  return known.length;
}

async function standBy(
  writer: Writer,
  ids: SiteIds,
  place: Place,
  kind: 'freeze' | 'confirm',
  { by, comment }: Person & { readonly comment: string },
): Promise<number> {
  const known = await baselinesOf(writer, await seriesOf(writer, ids, place));
  const meant = known.filter((baseline) => isMeant(kind, baseline));
  for (const baseline of meant) {
    const state = kind === 'freeze' ? 'frozen' : 'learned';
    await saveBaseline(writer, { ...baseline, state, refused: null, confirmed: { by, comment } });
  }
  return meant.length;
}

function isMeant(kind: 'freeze' | 'confirm', { state, medianLog }: StoredBaseline): boolean {
  if (medianLog === null) return false;
  return kind === 'confirm' ? state === 'refused' : state !== 'frozen';
}

async function seriesOf(writer: Writer, ids: SiteIds, { machine, point }: Place): Promise<number[]> {
  const points = point === null ? machine.points : [point];
  const rows = await writer
    .selectFrom('series')
    .select('id')
    .where(
      'point_id',
      'in',
      points.map(({ id }) => ids.pointId(machine.id, id)),
    )
    .orderBy('id')
    .execute();
  return rows.map(({ id }) => id);
}

/** A row of the journal about a place. */
export async function journalPlace(
  writer: Writer,
  ids: SiteIds,
  place: Place,
  person: Person,
  entry: {
    readonly event: JournalEventName;
    readonly comment: string | null;
    readonly usedMs: number | null;
    readonly reason: Readonly<Record<string, unknown>>;
  },
): Promise<void> {
  await appendJournal(writer, {
    key: null,
    number: null,
    event: entry.event,
    before: null,
    after: null,
    usedMs: entry.usedMs === null ? null : Math.round(entry.usedMs),
    wallMs: person.wallMs,
    recordingId: null,
    configVersionId: ids.configVersionId,
    actor: person.by,
    via: person.via,
    comment: entry.comment,
    reason: { place: pathOf(place), ...entry.reason },
  });
}

export function pathOf({ machine, point }: Place): string {
  return point === null ? machine.id : pointPath(point);
}
