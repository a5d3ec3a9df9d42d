/**
 * Flood control. ANSI/ISA-18.2-2016 and IEC 62682 call it a flood when more than 10 alarms come within 10 minutes, until
 * fewer than 5 do. While one stands, what comes is told for all machines together, in order of urgency: the first mail
 * when the usual gathering is over, then at most one an hour, one when it is over; a danger makes the mail leave after its
 * own short wait, with all that waits. What came in a backlog of recordings counts for no flood and is not part of one.
 *
 * 1. At most one flood stands; its beginning and its end are one transaction each, by what stands in the ledger.
 * 2. An event belongs to the flood in whose time it came, whenever its mail leaves; so it is told once, by itself or there.
 * 3. Several events of one alarm count as one.
 */
export const floodRule = {
  windowMs: 600_000,
  beginsAbove: 10,
  endsBelow: 5,
  /** Between two mails of a flood that goes on. */
  againMs: 3_600_000,
} as const;

/** What the number of alarms of the last ten minutes does to a flood. */
export function floodStep(stands: boolean, alarmsInWindow: number): 'begins' | 'ends' | null {
  if (!stands) return alarmsInWindow > floodRule.beginsAbove ? 'begins' : null;
  return alarmsInWindow < floodRule.endsBelow ? 'ends' : null;
}

/** One flood as the ledger has it. Wall times. */
export interface Flood {
  readonly id: number;
  /** When the first of the alarms came that made it one. */
  readonly fromMs: number;
  readonly begunMs: number;
  /** Null: it stands. */
  readonly endedMs: number | null;
}

export interface Arrived {
  readonly wallMs: number;
  readonly fromBacklog: boolean;
}

/** The flood that an event is part of. */
export function floodOf(floods: readonly Flood[], { wallMs, fromBacklog }: Arrived): Flood | null {
  if (fromBacklog) return null;
  const within = ({ fromMs, endedMs }: Flood) => wallMs >= fromMs && (endedMs === null || wallMs <= endedMs);
  return floods.find(within) ?? null;
}

/** Name under which a flood's mails and its end are kept. */
export function floodKey(id: number): string {
  return `flood:${id}`;
}
