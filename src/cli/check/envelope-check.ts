import { counted } from '../../advisory/level-words.ts';
import { printFrequency } from '../../config/print-value.ts';
import { chosenBand } from '../../manipulation/envelope-choice.ts';
import { type EnvelopePlan, envelopePlan } from '../../manipulation/envelope-plan.ts';
import type { PointCheck } from './point-check.ts';

/** How the next recording's envelope is made; null: nothing asks for one, or nothing says the sample rate. */
export function nextEnvelope({ point, averaging, ledger }: PointCheck): EnvelopePlan | null {
  const rateHz = averaging?.sampleRateHz ?? point.recordings.sampleRateHz;
  return envelopePlan(point, rateHz, chosenBand(ledger?.choice ?? null, point, rateHz));
}

/** Empty where a point has no envelope. */
export function envelopeCheckText(check: PointCheck): string {
  const { point, ledger } = check;
  const plan = nextEnvelope(check);
  if (point.envelope === undefined) return '';
  if (plan === null) return 'not known: nothing says the sample rate, or it is too low for the band';
  const { band, averaging, chosen } = plan;
  const made = [
    `of ${bandText(band)}`,
    `a line every ${printFrequency(averaging.sampleRateHz / averaging.segmentSamples)}`,
  ];
  if (point.envelope.choose === 'kurtosis') {
    if (chosen === 'kurtosis') made[0] += ', chosen by kurtosis';
    else made[0] += ' until five of ten recordings agree on a band by kurtosis';
  }
  const won = leader(ledger?.choice?.winners ?? []);
  if (chosen === 'fixed' && won !== null)
    made.push(`so far ${bandText(won)} won ${won.wins} of ${counted(won.looked, 'recording')}`);
  return made.join('; ');
}

export function envelopeCheckJson(check: PointCheck) {
  const plan = nextEnvelope(check);
  if (plan === null) return null;
  const { band, averaging, chosen } = plan;
  return {
    from_hz: band.fromHz,
    to_hz: band.toHz,
    choose: check.point.envelope?.choose === 'kurtosis' ? 'by kurtosis' : 'fixed',
    chosen,
    line_spacing_hz: averaging.sampleRateHz / averaging.segmentSamples,
  };
}

type Winner = { readonly fromHz: number; readonly toHz: number } | null;

/** The band with most wins among the newest recordings. */
function leader(winners: readonly Winner[]) {
  const counts = new Map<string, { fromHz: number; toHz: number; wins: number; looked: number }>();
  for (const one of winners) {
    if (one === null) continue;
    const key = `${one.fromHz} ${one.toHz}`;
    counts.set(key, { ...one, wins: (counts.get(key)?.wins ?? 0) + 1, looked: winners.length });
  }
  return [...counts.values()].sort((a, b) => b.wins - a.wins)[0] ?? null;
}

function bandText({ fromHz, toHz }: { readonly fromHz: number; readonly toHz: number }): string {
  return `${printFrequency(fromHz)} to ${printFrequency(toHz)}`;
}
