import type { LimitFacts } from '../advisory/facts.ts';
import type { DisplayUnit } from '../config/site.ts';
import { limitJson } from './level-json.ts';

/** Where a limit stands and why, as each command with `--json` says it. */
export function limitFactsJson(facts: LimitFacts | null, display: DisplayUnit | null) {
  const shown = (value: number | null | undefined) =>
    display === null ? null : limitJson(value ?? null, display);
  return {
    side: facts?.side ?? null,
    alert: shown(facts?.alert),
    danger: shown(facts?.danger),
    alert_because: facts?.reasons?.alert ?? null,
    danger_because: facts?.reasons?.danger ?? null,
    provisional_baseline: facts?.provisional ?? false,
    baseline_confirmed_by: facts?.confirmedBy ?? null,
    not_reckoned: facts?.unknown ?? null,
  };
}
