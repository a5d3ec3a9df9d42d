import type { BandFacts, MachineFacts, PointFacts } from './facts.ts';
import { bareLevel, changeText, counted, unitText } from './level-words.ts';
import type { Finding } from './summary-findings.ts';
import { dateText } from './time-words.ts';
import { foreign, idText, nameOf, placeText } from './wording.ts';

/** A repair or a change of sensor, and what the levels say of it: fourteen days before it against the days since. */
export interface RepairFacts {
  readonly kind: 'repair' | 'sensor-changed';
  readonly atMs: number;
  readonly by: string;
  readonly comment: string | null;
  readonly machine: MachineFacts;
  /** null: the whole machine. */
  readonly point: PointFacts | null;
  /** Whole days since, up to fourteen. */
  readonly daysSince: number;
  readonly bands: readonly RepairedBand[];
}

/** Medians of daily medians of one series and operating condition, SI r.m.s. */
export interface RepairedBand {
  readonly point: PointFacts;
  readonly band: BandFacts;
  /** '' where the machine has one condition only. */
  readonly condition: string;
  readonly before: { readonly level: number; readonly days: number };
  readonly after: { readonly level: number; readonly days: number };
}

export const comparedDays = 14;
const mostBands = 5;

/** The bands that changed most; all of them stand in the table below. */
export function repairFinding(repair: RepairFacts, timeZone: string): Finding {
  const { bands, comment, by, daysSince } = repair;
  const why = comment === null ? '' : `: ${foreign(comment)}`;
  const shown = byChange(bands).slice(0, mostBands);
  const rest = bands.length - shown.length;
  const more = rest > 0 ? [`and ${counted(rest, 'band')} more in the table below`] : [];
  const none =
    daysSince === 0
      ? 'The first whole day after it is not over yet.'
      : 'Nothing to compare: no day before and after with the same settings in the same operating condition.';
  return {
    mark: null,
    number: null,
    text: `${repairTitle(repair, timeZone)}, by ${foreign(by)}${why}; ${daysSince} of ${comparedDays} days after it`,
    todo: null,
    also: bands.length === 0 ? [none] : [...shown.map(bandText), ...more],
    since: null,
  };
}

/** 'Aeration blower 1, repair of Wed 2 Dec 2026'. */
export function repairTitle({ kind, machine, point, atMs }: RepairFacts, timeZone: string): string {
  const what = kind === 'repair' ? 'repair' : 'change of sensor';
  return `${placeText(machine, point)}: ${what} of ${dateText(atMs, timeZone)}`;
}

export const repairHeads = ['Point, band', 'Before (days)', 'After (days)', 'Change'];

export function repairRows({ bands }: RepairFacts): string[][] {
  return bands.map(({ point, band, condition, before, after }) => [
    `${nameOf(point)}, ${bandName(band, condition)}`,
    `${bareLevel(before.level, band.display)} ${unitText(band.display)} (${before.days})`,
    `${bareLevel(after.level, band.display)} ${unitText(band.display)} (${after.days})`,
    changeText(after.level / before.level),
  ]);
}

function byChange(bands: readonly RepairedBand[]): RepairedBand[] {
  const size = ({ before, after }: RepairedBand) => Math.abs(Math.log(after.level / before.level));
  return [...bands].sort((a, b) => size(b) - size(a));
}

/** 'drive end, horizontal, bearing: down 73 %, from 5.21 to 1.4 mm/s r.m.s.'. */
function bandText({ point, band, condition, before, after }: RepairedBand): string {
  const { display } = band;
  const levels = `from ${bareLevel(before.level, display)} to ${bareLevel(after.level, display)} ${unitText(display)}`;
  return `${nameOf(point)}, ${bandName(band, condition)}: ${changeText(after.level / before.level)}, ${levels}`;
}

function bandName(band: BandFacts, condition: string): string {
  return condition === '' ? idText(band.id) : `${idText(band.id)} in ${idText(condition)}`;
}
