import { levelText } from '../../advisory/level-words.ts';
import type { Quantity } from '../../config/site.ts';
import { usualDisplayUnit } from '../../config/units.ts';
import type { JournalRow } from '../../store/journal.ts';
import { type Row, table } from '../output.ts';
import { timeText } from '../when.ts';

/** Rows of the journal, as JSON and as a table. */
export function journalJson(row: JournalRow): Record<string, unknown> {
  return {
    sequence: row.sequence,
    time: new Date(row.wallMs).toISOString(),
    recorded: row.usedMs === null ? null : new Date(row.usedMs).toISOString(),
    event: row.event,
    number: row.number,
    about: row.key ?? placeOf(row),
    before: row.before,
    after: row.after,
    by: row.actor,
    via: row.via,
    comment: row.comment,
    reason: row.reason,
  };
}

/** `rows`: oldest first. */
export function journalText(rows: readonly JournalRow[], timeZone: string): string {
  if (rows.length === 0) return 'nothing is in the journal for this time\n';
  const columns = [
    { title: 'row', right: true },
    { title: 'time' },
    { title: 'event' },
    { title: 'no', right: true },
    { title: 'about', wraps: true },
    { title: 'by' },
  ];
  const lines = rows.flatMap((row): Row[] => {
    const about = aboutText(row);
    const beneath = [moved(row), levelOf(row), detailOf(row), row.comment].filter((text) => text !== null);
    return [
      [
        String(row.sequence),
        timeText(row.wallMs, timeZone),
        row.event,
        row.number === null ? '' : String(row.number),
        about,
        row.via === 'service' ? '' : row.actor,
      ],
      ...(beneath.length === 0 ? [] : [{ beneath: beneath.join('; ') }]),
    ];
  });
  return `${table(columns, lines)}\ntimes of ${timeZone}\n`;
}

/** 'pump-2/de-v overall' of 'limit:pump-2/de-v/overall/overall-fixed-upper'; 'overdue pump-2/de-v' of a trouble. */
function aboutText(row: JournalRow): string {
  const { key } = row;
  if (key === null) return placeOf(row) ?? 'the service';
  const limit = /^limit:([^/]+\/[^/]+)\/([^/]+)\//.exec(key);
  if (limit !== null) return `${limit[1]} ${limit[2]}`;
  const trouble = /^trouble:([^:]+):(.*)$/s.exec(key);
  return trouble === null ? key : `${trouble[1]} ${trouble[2]}`;
}

function moved({ before, after }: JournalRow): string | null {
  return before === after || before === null ? null : `${before} to ${after}`;
}

function levelOf({ reason }: JournalRow): string | null {
  const { level, quantity } = reason;
  if (typeof level !== 'number' || typeof quantity !== 'string') return null;
  return levelText(level, usualDisplayUnit(quantity as Quantity));
}

/** What a note or an order about baselines is about: a machine or `machine/point`. */
function placeOf({ reason }: JournalRow): string | null {
  return typeof reason.place === 'string' ? reason.place : null;
}

function detailOf({ reason }: JournalRow): string | null {
  if (typeof reason.note === 'string')
    return typeof reason.found === 'string' ? `${reason.note}, found: ${reason.found}` : reason.note;
  const detail = reason.detail ?? reason.file;
  return typeof detail === 'string' ? detail : null;
}
