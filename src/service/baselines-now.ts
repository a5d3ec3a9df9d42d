import type { BaselineNow } from '../advisory/summary-facts.ts';
import type { Limit, Point } from '../config/site.ts';
import { noBaseline } from '../detection/baseline.ts';
import type { Reader } from '../store/lent-connection.ts';
import { shownBaselines } from './shown-baselines.ts';
import type { SiteView } from './site-view.ts';

/** Baselines that limits of the point are reckoned from, by band: nobody need hear of one that serves nothing. */
export async function baselinesNow(
  reader: Reader,
  view: SiteView,
  point: Point,
): Promise<ReadonlyMap<string, readonly BaselineNow[]>> {
  const serving = new Set(point.limits.filter(asksBaseline).map(({ bandId }) => bandId));
  const byBand = new Map<string, BaselineNow[]>();
  if (serving.size === 0) return byBand;
  const machine = view.machine(point.machineId);
  for (const { band, condition, baseline } of await shownBaselines(reader, { machine, point })) {
    if (!serving.has(band.id)) continue;
    const { state, runningDays, refused, confirmed } = baseline ?? noBaseline;
    const now = { condition, state, runningDays, refused, confirmedBy: confirmed?.by ?? null };
    byBand.set(band.id, [...(byBand.get(band.id) ?? []), now]);
  }
  return byBand;
}

function asksBaseline({ rule }: Limit): boolean {
  return rule?.by === 'baseline' || rule?.by === 'spread' || rule?.by === 'change';
}
