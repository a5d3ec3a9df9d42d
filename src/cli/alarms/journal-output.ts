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
    about: row.key,
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
function aboutText({ key }: JournalRow): string {
  if (key === null) return 'the service';
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

function detailOf({ reason }: JournalRow): string | null {
  const detail = reason.detail ?? reason.file;
  return typeof detail === 'string' ? detail : null;
}
