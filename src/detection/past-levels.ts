/**
 * What the ledger has of a point over a long time, in columns: a year of hourly recordings of twelve bands is a hundred
 * thousand levels, and each is looked at by every limit of its band. Oldest first.
 */
export interface PastRecordings {
  /** Used times. */
  readonly usedMs: Float64Array;
  /** Local days, as `localDay` numbers them. */
  readonly day: Int32Array;
  /** Bits of `recordingMarks`. */
  readonly marks: Uint8Array;
  /** Behind the levels; 0: none. */
  readonly averages: Float64Array;
  /** Measured, Hz; NaN: unknown. */
  readonly speedHz: Float64Array;
  /** NaN: unknown. */
  readonly loadPercent: Float64Array;
  /** Place in `conditions`; -1: outside all of them. */
  readonly condition: Int16Array;
  readonly conditions: readonly string[];
}

export const recordingMarks = {
  /** It came in its turn, and the machine ran: it is held against limits. */
  judged: 1,
  /** It carries a flag, so that it never clears an alarm. */
  flagged: 2,
  /** The same for bands in orders, which a doubtful speed moves. */
  flaggedInOrders: 4,
  /** Only a danger that its own segments prove counts: its level went into a pool. */
  onlyAtOnce: 8,
  /** Its measurement is without a finding: baselines may learn from it. */
  good: 16,
} as const;

/** Levels of one band. */
export interface PastLevels {
  /** Place of its recording. */
  readonly at: Int32Array;
  /** SI r.m.s. */
  readonly level: Float64Array;
  readonly intervalLow: Float64Array;
  readonly intervalHigh: Float64Array;
  /** What 80 % of the segments exceed; NaN: unknown. */
  readonly exceeded: Float64Array;
  /** Bits of `levelMarks`. */
  readonly marks: Uint8Array;
  /** Any numbering; levels of different series are never compared. */
  readonly series: Int32Array;
}

export const levelMarks = {
  atLeast: 1,
  /** Of a machine that ran in one of its conditions; baselines and rates look at these. */
  inTrend: 2,
} as const;

/** One name for a series in a condition. */
export function learnedKey(series: number, condition: number): number {
  // Conditions are few; a site file has no thousand of them for one machine.
  return series * 1024 + condition;
}
