import type { Generated } from 'kysely';

/** Tables of what is usual and of what was done to machines. Conventions as in schema.ts. */

/** Operating conditions by surrogate id; 0 in other tables: the machine's list is empty, all running is one. */
export interface ConditionsTable {
  id: Generated<number>;
  machine_id: number;
  id_in_site: string;
}

/** A band's levels of one local day in one series and operating condition; made when a later day begins. */
export interface DailyLevelsTable {
  point_id: number;
  band_id: number;
  series_id: number;
  condition_id: number;
  /** Local day: days since 1970-01-01 of the date that the site's clocks show. */
  day: number;
  /** Used time of the middle recording of the day. */
  used_ms: number;
  /** Running hours of the machine at that recording; null in ledgers from before they were counted. */
  running_hours: number | null;
  count: number;
  least: number;
  median: number;
  greatest: number;
}

/** Newest local day that a point's recordings have reached, by the used time of one of them. */
export interface DayMarksTable {
  point_id: number;
  used_ms: number;
}

export interface BaselinesTable {
  series_id: number;
  condition_id: number;
  state: string;
  /** Readings before this used time take no part. */
  learn_from_ms: number;
  from_ms: number | null;
  to_ms: number | null;
  running_days: number;
  recordings: number;
  median_log: number | null;
  spread_log: number | null;
  refused: string | null;
  confirmed_by: string | null;
  confirm_comment: string | null;
}

/** What people did to a machine, or what they have to say. */
export interface NotesTable {
  id: Generated<number>;
  machine_id: number;
  /** null: the whole machine. */
  point_id: number | null;
  /** repair | sensor-changed | lubricated | balanced | remark */
  kind: string;
  at_ms: number;
  wall_ms: number;
  found: string | null;
  by_name: string;
  comment: string | null;
}
