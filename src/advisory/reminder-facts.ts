/** Why something is told again without a change of its level; conventions as in facts.ts. */

/** A mail that asks once more for an acknowledgement. */
export interface ReminderFacts {
  /** Counts from 1. */
  readonly number: number;
  /** When a server took the mail that is not acknowledged. */
  readonly toldMs: number;
  /** Who is told as well by now, because reminders have not helped. */
  readonly thenTo: readonly string[];
}

/** Told again because it still stands: who had acknowledged it, and when. */
export interface WasAcknowledged {
  readonly by: string;
  readonly ms: number;
}
