import { allBoundaries } from '../../advisory/zone-words.ts';
import { bandZone, isJudged, type ZoneAnswer } from '../../assessment/zone.ts';
import { zonesName } from '../../config/machine-zones.ts';
import type { TrendRow } from '../../service/trend-of-band.ts';
import type { ShownTrend } from './trend-output.ts';

/** The zones of a band over time. */
export interface TrendZones {
  /** The table with its boundaries; or why none of the levels is in a zone. */
  readonly headline: string;
  /** 'C', '>= C'; '' where that level is in no zone. */
  readonly letterOf: (row: TrendRow) => string;
}

/** Null where the machine has no zones, or the band is of nothing that a table judges. */
export function trendZones({ site, point, band, trend }: ShownTrend): TrendZones | null {
  const machine = site.machines.find(({ id }) => id === point.machineId);
  const zones = machine?.zones ?? null;
  if (machine === undefined || zones === null || band.of === 'envelope') return null;
  if (!isJudged(zones, band.quantity)) return null;
  const nominalRpm = machine.runningSpeedHz === null ? null : machine.runningSpeedHz * 60;
  const answerOf = (row: TrendRow): ZoneAnswer | null => {
    const edges = trend.series.find(({ id }) => id === row.seriesId);
    if (edges === undefined) return null;
    const { machineState: state, flags, level, atLeast } = row;
    const { quantity, fromHz, toHz } = edges;
    const speedRpm = row.speedRpm ?? nominalRpm;
    return bandZone(
      zones,
      { point, state, speedRpm, flags },
      { bandId: band.id, quantity, fromHz, toHz, level, atLeast },
    );
  };
  const answers = new Map(trend.rows.map((row) => [row, answerOf(row)]));
  const inZone = [...answers.values()].findLast((answer) => answer !== null && answer.letter !== null);
  const newest = [...answers.values()].at(-1);
  const name = zonesName(zones);
  return {
    headline:
      inZone?.letter != null
        ? `zones of ${name}: ${allBoundaries(inZone.boundaries, band.display)}`
        : `no zone of ${name}${newest?.letter === null ? `: ${newest.why}` : ''}`,
    letterOf: (row) => {
      const answer = answers.get(row);
      return answer?.letter == null ? '' : `${answer.atLeast ? '>= ' : ''}${answer.letter}`;
    },
  };
}
