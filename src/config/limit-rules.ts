/**
 * How a limit comes by its values. `stands`: they are in the site file (kinds fixed and zone). All others are reckoned
 * for each recording; `alert` and `danger` of the limit itself then hold what the site gave as a level besides.
 */
export type LimitRule =
  | { readonly by: 'stands' }
  /** Multiples of the baseline's median. */
  | { readonly by: 'baseline'; readonly alert: number | null; readonly danger: number | null }
  /** Spreads of the baseline above its median, on logarithms. */
  | { readonly by: 'spread'; readonly alert: number; readonly danger: number | null }
  /** Distance from the baseline's median, up or down; SI r.m.s. */
  | { readonly by: 'change'; readonly alert: number }
  /** Growth (1.5: by half) of the line through the levels over this time. */
  | {
      readonly by: 'rate';
      readonly overMs: number;
      readonly alert: number | null;
      readonly danger: number | null;
    }
  /** Straight lines between these values, over the running speed (Hz) or the load (percent). */
  | {
      readonly by: 'curve';
      readonly over: 'speed' | 'load';
      readonly values: readonly CurveValue[];
    };

export interface CurveValue {
  /** Hz or percent; growing from value to value. */
  readonly at: number;
  /** SI r.m.s. */
  readonly alert: number | null;
  readonly danger: number | null;
}

/** What a learned value may not pass, and in words whose ceiling it is; null: there is none. */
export interface Ceiling {
  readonly value: number;
  readonly why: string;
}
