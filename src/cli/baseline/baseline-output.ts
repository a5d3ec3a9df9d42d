import { bareLevel, unitText } from '../../advisory/level-words.ts';
import { inDisplayUnit, printNumber } from '../../config/print-value.ts';
import { pointPath } from '../../config/site.ts';
import { type BaselineState, baselineRules } from '../../detection/baseline.ts';
import type { ShownBaseline } from '../../service/shown-baselines.ts';
import { bareUnit } from '../level-json.ts';
import { type Row, table } from '../output.ts';
import { timeText } from '../when.ts';

/** Baselines as JSON and as a table. */
export function baselineJson({ point, band, condition, baseline }: ShownBaseline): Record<string, unknown> {
  const level = (log: number | null | undefined) =>
    log == null ? null : inDisplayUnit(Math.exp(log), band.display);
  return {
    machine: point.machineId,
    point: point.id,
    band: band.id,
    condition: condition === '' ? null : condition,
    state: baseline?.state ?? 'learning',
    unit: bareUnit(band.display),
    detector: band.display.detector,
    median: level(baseline?.medianLog),
    spread_percent: baseline?.spreadLog == null ? null : 100 * Math.expm1(baseline.spreadLog),
    from: isoOrNull(baseline?.fromMs),
    to: isoOrNull(baseline?.toMs),
    running_days: baseline?.runningDays ?? 0,
    recordings: baseline?.recordings ?? 0,
    refused: baseline?.refused ?? null,
    confirmed_by: baseline?.confirmed?.by ?? null,
    confirm_comment: baseline?.confirmed?.comment ?? null,
  };
}

export function baselineText(shown: readonly ShownBaseline[], timeZone: string): string {
  if (shown.length === 0) return 'no baseline: the ledger has no levels yet\n';
  const rows = shown.flatMap((one): Row[] => {
    const { point, band, condition, baseline } = one;
    const name = `${pointPath(point)} ${band.id}${condition === '' ? '' : ` (${condition})`}`;
    const usual =
      baseline?.medianLog == null
        ? '-'
        : `${bareLevel(Math.exp(baseline.medianLog), band.display)} ${unitText(band.display)}`;
    const spread =
      baseline?.spreadLog == null ? '-' : `${printNumber(100 * Math.expm1(baseline.spreadLog), 2)} %`;
    const days = String(baseline?.runningDays ?? 0);
    const row = [name, baseline?.state ?? 'learning', usual, spread, days];
    return [row, ...beneath(one, timeZone).map((text) => ({ beneath: text }))];
  });
  const columns = [
    { title: 'machine/point band', wraps: true },
    { title: 'state' },
    { title: 'median', right: true },
    { title: 'spread', right: true },
    { title: 'running days', right: true },
  ];
  const states = new Set(shown.map(({ baseline }) => baseline?.state ?? 'learning'));
  const notes = [...states].flatMap((state) => meanings[state] ?? []);
  return `${table(columns, rows, undefined, 4)}${notes.map((note) => `\n${note}`).join('')}\n`
    .trimEnd()
    .concat('\n');
}

const { provisionalDays, learnedDays, refinedDays } = baselineRules;

/** What a state means for limits, where people would not know. */
const meanings: Partial<Record<BaselineState, string>> = {
  learning: `learning: no limit is reckoned from it before ${provisionalDays} running days`,
  provisional: `provisional: its limits stand wide until ${learnedDays} running days`,
  learned: `learned: still refined until ${refinedDays} running days`,
  refused: 'refused: no limit is reckoned from it; --confirm lets it stand, --learn-again begins anew',
};

function beneath({ baseline }: ShownBaseline, timeZone: string): string[] {
  if (baseline === null) return [];
  const lines: string[] = [];
  if (baseline.refused !== null) lines.push(`refused: ${baseline.refused}`);
  if (baseline.confirmed !== null) {
    const { by, comment } = baseline.confirmed;
    lines.push(`${baseline.state === 'frozen' ? 'frozen' : 'confirmed'} by ${by}: ${comment}`);
  }
  if (baseline.fromMs !== null && baseline.toMs !== null)
    lines.push(`${timeText(baseline.fromMs, timeZone)} to ${timeText(baseline.toMs, timeZone)}`);
  return lines;
}

function isoOrNull(ms: number | null | undefined): string | null {
  return ms == null ? null : new Date(ms).toISOString();
}
