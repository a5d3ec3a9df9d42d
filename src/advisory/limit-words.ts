import type { LimitFacts } from './facts.ts';
import { foreign } from './wording.ts';

/** Why a limit stands where it stands, where it is not the site's own number; null where it is. */
export function reasonsText({ reasons, provisional, confirmedBy, unknown }: LimitFacts): string | null {
  if (unknown !== undefined) return `not reckoned now: ${foreign(unknown)}`;
  const said = (['alert', 'danger'] as const).flatMap((severity) => {
    const why = reasons?.[severity] ?? null;
    return why === null ? [] : [`${severity} at ${foreign(why)}`];
  });
  if (provisional === true) said.push('provisional baseline');
  if (confirmedBy !== undefined) said.push(`baseline confirmed by ${foreign(confirmedBy)}`);
  return said.length === 0 ? null : said.join('; ');
}
