import type { MachineFacts, PointFacts } from './facts.ts';
import { byUrgency, largestShare } from './ranking.ts';
import type { Standing } from './summary.ts';
import type { BandNow, SummaryFacts } from './summary-facts.ts';

/** What got worse and passed no limit: which bands, and which of them first. */

/** A band that got worse without passing a limit. */
export interface Worse {
  readonly machine: MachineFacts;
  readonly point: PointFacts;
  readonly now: BandNow;
}

const weekMs = 7 * 86_400_000;

/**
 * Bands that no limit speaks of and whose change is for the worse, or significant by the standard of their zones (up or
 * down), or whose trend is, or which leave their sisters; by criticality, then share of the alert limit.
 */
export function worseOf(facts: SummaryFacts, standing: readonly Standing[]): Worse[] {
  const told = new Set(
    standing
      .filter((item) => item.kind === 'alarm')
      .map((item) => bandKey(item.machine, item.point, item.band)),
  );
  const found: Worse[] = facts.points
    // A machine that stands this morning ran yesterday, or shows no change.
    .filter(({ judging }) => judging !== 'blind' && judging !== 'out-of-service')
    .flatMap(({ machine, point, bands }) => bands.map((now) => ({ machine, point, now })))
    .filter(
      ({ machine, point, now }) =>
        isWorse(now, facts.writtenMs) && !told.has(bandKey(machine, point, now.band)),
    );
  const rank = ({ machine, now }: Worse) => ({
    machine,
    severity: null,
    share: now.level === null ? null : largestShare(now.level.level, now.limits),
  });
  return found.sort(
    (a, b) => byUrgency(rank(a), rank(b)) || (b.now.change?.ratio ?? 0) - (a.now.change?.ratio ?? 0),
  );
}

function isWorse(now: BandNow, writtenMs: number): boolean {
  return (
    now.change?.worse === true ||
    now.zone?.change?.significant === true ||
    now.sister?.leaves === true ||
    isTrendWorse(now, writtenMs)
  );
}

/** A rise; or a fall where only lower limits guard the band. Of a machine that has stood for a week it is old news. */
function isTrendWorse({ trend, limits, level }: BandNow, writtenMs: number): boolean {
  if (level === null || writtenMs - level.usedMs > weekMs) return false;
  const guardedBelow = limits.length > 0 && limits.every(({ side }) => side === 'lower');
  return trend?.trend.kind === (guardedBelow ? 'falling' : 'rising');
}

function bandKey(machine: MachineFacts, point: PointFacts, band: { readonly id: string }): string {
  return `${machine.id}\n${point.id}\n${band.id}`;
}

/** Of what nobody measured no one can say that it did not rise. */
export function nothingWorse({ points }: SummaryFacts): string {
  const compared = points.some(({ bands }) => bands.some(({ change }) => change !== null));
  return compared ? 'Nothing rose by more than its ordinary spread.' : 'There is nothing to compare yet.';
}
