import type { Ceiling, LimitRule } from './limit-rules.ts';
import type { SuppressedWhile } from './suppressed-while.ts';

/** A limit of one band of one point, as the site file means it. */

export type LimitKind = 'fixed' | 'zone' | 'baseline' | 'statistical' | 'change' | 'rate' | 'curve';

/** Where alert and danger come from, in words; null: as the site file gives them. */
export interface LimitReasons {
  readonly alert: string | null;
  readonly danger: string | null;
}

export interface Limit {
  /** As written, or `band-kind-side`. Unique within its point. */
  readonly id: string;
  readonly formerly: readonly string[];
  readonly bandId: string;
  readonly kind: LimitKind;
  readonly side: 'upper' | 'lower';
  /** SI r.m.s., as they stand in the site file; at least one of the two is set where no rule reckons them. */
  readonly alert: number | null;
  readonly danger: number | null;
  readonly reasons?: LimitReasons | null;
  /** How its values come about; without it they stand. */
  readonly rule?: LimitRule;
  /** What values by the rule may not pass. */
  readonly ceilings?: { readonly alert: Ceiling | null; readonly danger: Ceiling | null };
  /** An alert counts only where the whole interval of the level is past the limit; a danger never waits for that. */
  readonly confident?: boolean;
  /** Operating conditions in which it holds; null: in all. */
  readonly conditions?: readonly string[] | null;
  /** Its alarm is held back while one of these holds: those of the limit, of its point and of its machine. */
  readonly suppressedWhile?: readonly SuppressedWhile[];
  readonly onDelay: Delay;
  readonly offDelay: Delay;
  readonly deadbandPercent: number;
  readonly latching: boolean;
  /** Told again when an acknowledged alarm's level has risen by this much since it was last told; null: never. */
  readonly sayAgainPercent: number | null;
  readonly action: string | null;
  readonly respondWithinMs: number | null;
  /** An acknowledged alarm that still stands so long afterwards is told again; null or left out: never. */
  readonly sayAgainAfterMs?: number | null;
  /** First reminder while nobody has acknowledged it; null: none; left out: as `mail` says. */
  readonly remindAfterMs?: number | null;
  /** Who joins when reminders have not helped; left out: as `mail` says. */
  readonly thenTo?: readonly string[];
}

export type Delay = { readonly recordings: number } | { readonly ms: number };
