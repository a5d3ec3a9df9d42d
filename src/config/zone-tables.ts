import { parseLevel } from './level.ts';
import type { DisplayUnit } from './site.ts';

/**
 * The tables of evaluation zones as they lie in `config/zones/*.json`: one file a standard, each row with the source
 * of its figures. Read here from the text of a file; chosen from by `machine-zones.ts`.
 */
export const zoneStandards = ['iso-20816-3', 'iso-10816-3', 'iso-10816-7', 'iso-10816-1'] as const;
export type ZoneStandard = (typeof zoneStandards)[number];

/** From good to bad. */
export const zoneLetters = ['A', 'B', 'C', 'D'] as const;
export type ZoneLetter = (typeof zoneLetters)[number];

/** Null of nothing. */
export function worstZone(letters: readonly ZoneLetter[]): ZoneLetter | null {
  return zoneLetters.findLast((letter) => letters.includes(letter)) ?? null;
}

/**
 * Where a figure comes from: `seen` in a source that restates the standard, or from `memory`, to be compared with the
 * standard before anybody relies on it.
 */
export interface Sourced {
  readonly known: 'seen' | 'memory';
  readonly source: string;
}

/** Boundaries between the zones for one quantity: SI r.m.s.; what the table gives peak to peak is derived. */
export interface ZoneBoundaries extends Sourced {
  readonly quantity: 'velocity' | 'displacement';
  readonly ab: number;
  readonly bc: number;
  readonly cd: number;
  /** Ceilings of alert and danger: as the table prints them, else 1.25 x B/C and 1.25 x C/D. */
  readonly alarmAtMost: number;
  readonly tripAtMost: number;
  /** The table's own unit. */
  readonly display: DisplayUnit;
}

/** What a machine must be for a row; a condition that a row does not name holds for all. Powers in kW, heights in mm. */
export interface RowConditions {
  readonly group?: '1' | '2';
  readonly support?: 'rigid' | 'flexible';
  readonly category?: 'I' | 'II';
  readonly class?: 'I' | 'II' | 'III' | 'IV';
  readonly powerAboveKw?: number;
  readonly powerToKw?: number;
  readonly shaftHeightFromMm?: number;
  readonly shaftHeightBelowMm?: number;
}

export interface ZoneRow extends ZoneBoundaries {
  readonly when: RowConditions;
}

/** What is the same for all rows of a standard. */
export interface ZoneTableFacts {
  readonly standard: ZoneStandard;
  /** 'ISO 20816-3'. */
  readonly name: string;
  readonly about: string;
  /** Made for rotodynamic pumps, and only for them. */
  readonly pumps: boolean;
  /** Range over which a level is taken. */
  readonly frequency: Sourced & { readonly fromHz: number; readonly toHz: number };
  /** A lower begin of the range for machines below a speed. */
  readonly slow: (Sourced & { readonly belowRpm: number; readonly fromHz: number }) | null;
  readonly speed: (Sourced & { readonly fromRpm: number; readonly toRpm: number | null }) | null;
}

export interface ZoneTable extends ZoneTableFacts {
  readonly rows: readonly ZoneRow[];
}

type WrittenRow = Sourced & {
  readonly when: RowConditions;
  readonly quantity: ZoneBoundaries['quantity'];
  readonly unit: string;
  readonly ab: number;
  readonly bc: number;
  readonly cd: number;
  readonly alarmAtMost?: number;
  readonly tripAtMost?: number;
};

/** ISO 10816-1 and -3, 5.4.1 and 5.4.2: neither ALARM nor TRIP should normally exceed its boundary by more. */
export const ceiling = 1.25;

/**
 * A table from the text of its file, boundaries in SI r.m.s. These files belong to the program, so one that does not
 * hold what it should is a broken promise: throws.
 */
export function readZoneTable(text: string): ZoneTable {
  const written = JSON.parse(text) as ZoneTableFacts & { readonly rows: readonly WrittenRow[] };
  const { standard, name, about, pumps, frequency, slow, speed } = written;
  if (!zoneStandards.includes(standard)) throw new Error(`no zone table is called ${standard}`);
  const rows = written.rows.map((row): ZoneRow => {
    const { when, quantity, known, source } = row;
    const { ab, bc, cd, alarmAtMost, tripAtMost } = siValues(row);
    if (!(0 < ab && ab < bc && bc < alarmAtMost && alarmAtMost < cd && cd < tripAtMost))
      throw new Error(`a row of ${name} is not in order: ${JSON.stringify(row)}`);
    const display = levelOf(row, row.ab).display;
    return { when, quantity, ab, bc, cd, alarmAtMost, tripAtMost, display, known, source };
  });
  return { standard, name, about, pumps, frequency, slow, speed, rows };
}

function siValues(row: WrittenRow) {
  const si = (value: number) => levelOf(row, value).value;
  return {
    ab: si(row.ab),
    bc: si(row.bc),
    cd: si(row.cd),
    alarmAtMost: si(row.alarmAtMost ?? ceiling * row.bc),
    tripAtMost: si(row.tripAtMost ?? ceiling * row.cd),
  };
}

function levelOf({ quantity, unit }: WrittenRow, value: number) {
  const parsed = parseLevel(`${value} ${unit}`, quantity);
  if (!parsed.ok) throw new Error(`a zone table has ${value} ${unit}: ${parsed.what}`);
  return parsed.value;
}
