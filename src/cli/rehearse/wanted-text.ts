import { plain } from '../../advisory/escape.ts';
import { type HowOften, printHowOften } from '../../config/how-often.ts';
import { differenceUnit, printLevel, printNumber } from '../../config/print-value.ts';
import { pointPath } from '../../config/site.ts';
import type { WantedLimit } from '../../detection/wanted-limit.ts';
import type { RehearsedLimit, SiteRehearsal } from '../../service/rehearse.ts';
import { table, wrapText } from '../output.ts';

/** Rows of a table for people; JSON has all. */
export const mostRows = 40;

/** For each limit the value with which it would have come no more often than wanted. */
export function wantedText(wanted: HowOften | null, rehearsal: SiteRehearsal): string {
  if (wanted === null) return '';
  const found = rehearsal.limits
    .flatMap((one) => (one.wanted === null ? [] : [{ one, found: one.wanted }]))
    .sort((a, b) => b.one.inTime.count - a.one.inTime.count);
  if (found.length === 0) return wrapped('No limit has a value that could be moved.');
  const rows = found.slice(0, mostRows).map(({ one, found: { moves, now, value, count } }) => {
    const text = (shown: number) => valueText(moves, shown, one);
    return [
      nameOf(one),
      moves,
      text(now),
      String(one.inTime.count),
      value === null ? 'none' : text(value),
      count === null ? '' : String(count),
    ];
  });
  const columns = [
    { title: `for ${printHowOften(wanted)}`, wraps: true },
    { title: '' },
    { title: 'now', right: true },
    { title: 'alarms', right: true },
    { title: 'instead', right: true },
    { title: 'alarms', right: true },
  ];
  const more = found.length - mostRows;
  return `${table(columns, rows)}${more > 0 ? `and ${more} more limits (--json has all)\n` : ''}`;
}

function valueText(moves: WantedLimit['moves'], value: number, { band }: RehearsedLimit): string {
  switch (moves) {
    case 'alert':
    case 'danger':
      return printLevel(value, band.display);
    case 'change':
      return printLevel(value, differenceUnit(band.display));
    case 'k':
      return printNumber(value);
    case 'multiple':
    case 'growth':
      return `${printNumber(value)}x`;
  }
}

export function nameOf({ point, limit }: Pick<RehearsedLimit, 'point' | 'limit'>): string {
  return `${pointPath(point)} ${limit.id}`;
}

export function wrapped(text: string): string {
  return `${wrapText(plain(text), 80).join('\n')}\n`;
}
