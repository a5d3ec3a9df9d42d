import { type HowOften, printHowOften, timesWithin } from '../../config/how-often.ts';
import { localDate } from '../../config/local-time.ts';
import { printNumber } from '../../config/print-value.ts';
import { pointPath, type Site } from '../../config/site.ts';
import type { SiteRehearsal } from '../../service/rehearse.ts';
import { type Row, table } from '../output.ts';
import { timeText } from '../when.ts';
import { mostRows, nameOf, wantedText, wrapped } from './wanted-text.ts';

export interface ShownRehearsal {
  readonly site: Site;
  /** Null: the whole site. */
  readonly machineId: string | null;
  readonly wanted: HowOften | null;
  readonly rehearsal: SiteRehearsal;
}

const weekMs = 7 * 86_400_000;
const hourMs = 3_600_000;
const mostPeople = 10;

export function budgetOf({ alarmBudget }: Site): HowOften {
  return alarmBudget ?? { times: 5, per: 'week' };
}

/** A rehearsal for people: what would have come, whom it would have reached, what to change. */
export function rehearsalText(shown: ShownRehearsal): string {
  const { rehearsal, machineId } = shown;
  const parts = [
    headText(shown),
    limitsText(shown),
    machineId === null ? '' : eachText(shown),
    goneText(shown),
    budgetText(shown),
    wantedText(shown.wanted, rehearsal),
    cannotText(rehearsal),
    ...rehearsal.remarks.map((remark) => wrapped(remark)),
  ];
  return parts.filter((part) => part !== '').join('\n');
}

function headText({ site, rehearsal }: ShownRehearsal): string {
  const { fromMs, toMs } = rehearsal;
  const { limits } = rehearsal;
  const alarms = limits.reduce((sum, { inTime }) => sum + inTime.count, 0);
  const came =
    limits.reduce((sum, one) => sum + one.came.length, 0) +
    [...rehearsal.gone.values()].reduce((sum, one) => sum + one.length, 0);
  const days = Math.max(1, Math.round((toMs - fromMs) / (24 * hourMs)));
  const dates = `${localDate(fromMs, site.timeZone)} to ${localDate(toMs, site.timeZone)}`;
  const places = new Set(limits.map(({ point }) => pointPath(point))).size;
  return wrapped(
    `${counted(days, 'day')} (${dates}), ${counted(limits.length, 'limit')} of ${counted(places, 'point')}: ` +
      `${counted(alarms, 'alarm')} would have come, ${came} came.`,
  );
}

function limitsText(shown: ShownRehearsal): string {
  const { rehearsal, site } = shown;
  const telling = rehearsal.limits
    .filter(({ inTime, came }) => inTime.count > 0 || inTime.inAlarmMs > 0 || came.length > 0)
    .sort((a, b) => b.inTime.count - a.inTime.count || b.inTime.inAlarmMs - a.inTime.inAlarmMs);
  const quiet = rehearsal.limits.length - telling.length;
  const blind = rehearsal.limits.filter(
    ({ rehearsal: { compared, unknown } }) => compared === 0 && unknown > 0,
  );
  const rest = [
    ...(telling.length > mostRows ? [`and ${telling.length - mostRows} more limits (--json has all)`] : []),
    ...(quiet > 0 ? [`${counted(quiet, 'limit')} would not have given an alarm.`] : []),
    ...(blind.length > 0
      ? [`${counted(blind.length, 'limit')} of these had no baseline in all that time and watched nothing.`]
      : []),
  ];
  if (telling.length === 0) return rest.map(wrapped).join('');
  const columns = [
    { title: 'limit', wraps: true },
    { title: 'alarms', right: true },
    { title: 'came', right: true },
    { title: 'in alarm', right: true },
    { title: 'longest', right: true },
    { title: 'last' },
  ];
  const rows = telling.slice(0, mostRows).flatMap((one): Row[] => {
    const { inTime } = one;
    const remarks = [
      ...(inTime.dangers > 0 ? [`danger ${inTime.dangers}`] : []),
      ...(inTime.stands ? ['still stands'] : []),
      ...(inTime.chattering > 0
        ? [`comes and goes: ${inTime.chattering} times held back or told as chattering`]
        : []),
    ];
    const row = [
      nameOf(one),
      String(inTime.count),
      String(one.came.length),
      lengthText(inTime.inAlarmMs),
      lengthText(inTime.longestMs),
      inTime.lastRaisedMs === null ? '' : localDate(inTime.lastRaisedMs, site.timeZone),
    ];
    return remarks.length === 0 ? [row] : [row, { beneath: remarks.join('; ') }];
  });
  return `${table(columns, rows, undefined, 2)}${rest.map(wrapped).join('')}`;
}

/** Each alarm of one machine, those that came marked. */
function eachText({ rehearsal, site, machineId }: ShownRehearsal): string {
  const alarms = rehearsal.limits
    .flatMap((one) => {
      const cameAt = new Set(one.came.map(({ raisedMs }) => raisedMs));
      const would = one.rehearsal.alarms
        .filter(({ raisedMs }) => raisedMs >= rehearsal.fromMs)
        .map((alarm) => ({ one, alarm, note: cameAt.delete(alarm.raisedMs) ? 'came' : 'would come' }));
      const only = one.came.filter(({ raisedMs }) => cameAt.has(raisedMs));
      return [...would, ...only.map((alarm) => ({ one, alarm, note: 'came, would not' }))];
    })
    .sort((a, b) => a.alarm.raisedMs - b.alarm.raisedMs);
  if (alarms.length === 0) return '';
  const cut = alarms.length - mostRows;
  const rows = alarms
    .slice(-mostRows)
    .map(({ one, alarm, note }) => [
      timeText(alarm.raisedMs, site.timeZone),
      alarm.severity,
      alarm.returnedMs === null ? 'stands' : lengthText(alarm.returnedMs - alarm.raisedMs),
      note,
      `${one.point.id} ${one.limit.id}`,
    ]);
  const columns = [
    { title: 'raised' },
    { title: 'severity' },
    { title: 'for', right: true },
    { title: '' },
    { title: `limit of ${machineId}`, wraps: true },
  ];
  return `${table(columns, rows)}${cut > 0 ? `and ${cut} earlier ones (--json has all)\n` : ''}`;
}

function goneText({ rehearsal: { gone } }: ShownRehearsal): string {
  if (gone.size === 0) return '';
  const alarms = [...gone.values()].reduce((sum, one) => sum + one.length, 0);
  const names = [...gone.keys()].map((key) => key.replace(/^limit:/, '')).sort();
  const rest = names.length > 5 ? ` and ${names.length - 5} more` : '';
  return wrapped(
    `${counted(alarms, 'alarm')} came of limits that this file does not have, or whose band cannot be ` +
      `rehearsed: ${names.slice(0, 5).join(', ')}${rest}`,
  );
}

function budgetText({ site, rehearsal }: ShownRehearsal): string {
  const { people, fromMs, toMs } = rehearsal;
  const budget = budgetOf(site);
  const words = `${printHowOften(budget)} a person`;
  if (people.length === 0) return wrapped(`Budget ${words}: nobody gets mail by this file.`);
  const weeks = (toMs - fromMs) / weekMs;
  const most = timesWithin(budget, toMs - fromMs);
  const rows = [...people]
    .sort((a, b) => b.told - a.told)
    .slice(0, mostPeople)
    .map(({ address, told, busiest }) => [
      address,
      String(told),
      printNumber(told / weeks),
      busiest === null ? '' : `${busiest.told} from ${localDate(busiest.fromMs, site.timeZone)}`,
      told > most ? 'over the budget' : 'within',
    ]);
  const columns = [
    { title: `budget ${words}`, wraps: true },
    { title: 'told', right: true },
    { title: 'a week', right: true },
    { title: 'busiest week' },
    { title: '' },
  ];
  const more = people.length - mostPeople;
  return `${table(columns, rows)}${more > 0 ? `and ${more} more people\n` : ''}`;
}

function cannotText({ cannot }: SiteRehearsal): string {
  if (cannot.length === 0) return '';
  const reasons = new Map<string, string[]>();
  for (const { point, band, why } of cannot)
    reasons.set(why, [...(reasons.get(why) ?? []), `${pointPath(point)} ${band.id}`]);
  return [...reasons]
    .map(([why, names]) => {
      const rest = names.length > 5 ? ` and ${names.length - 5} more` : '';
      return wrapped(
        `Cannot be rehearsed, ${why}: ${names.slice(0, 5).join(', ')}${rest}. Their recordings have to be reanalysed.`,
      );
    })
    .join('');
}

/** '40 min', '5 h', '3.2 d'. */
function lengthText(ms: number): string {
  if (ms === 0) return '-';
  if (ms < 2 * hourMs) return `${printNumber(ms / 60_000, 2)} min`;
  return ms < 48 * hourMs ? `${printNumber(ms / hourMs, 2)} h` : `${printNumber(ms / (24 * hourMs), 3)} d`;
}

function counted(count: number, what: string): string {
  return `${count} ${what}${count === 1 ? '' : 's'}`;
}
