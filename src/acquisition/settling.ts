import { printSeconds } from '../config/print-value.ts';
import type { RecordingHeader, Refusal } from './recording.ts';

/**
 * When a file in the drop folder is all there. A logger or a file share may still write it, may have reserved its
 * full size before the first byte, may stop half way. So a file is ready when size, time of change and inode have
 * stood still for `settleMs` and its own header says that it is complete; what is not there after
 * `incompleteAfterMs` is given up with the reason.
 *
 *     first seen -> wait while anything changes -> look (read the header) -> ready
 *                                                     | header wants more, or the tail is all zeros: wait
 *     after incompleteAfterMs: still growing or incomplete -> give up; complete over a tail of zeros -> ready, flagged
 *
 * All waits are measured on the monotonic clock; a clock that is set cannot lengthen or shorten them.
 */
export interface FileObservation {
  readonly sizeBytes: number;
  readonly modifiedMs: number;
  readonly changedMs: number;
  /** Device and inode as one text. */
  readonly inode: string;
  readonly monotonicMs: number;
  /** What the header said when the file was last looked into, unchanged since; null before. */
  readonly header: HeaderLook | null;
}

export interface HeaderLook {
  /** The file is as long as its header says. */
  readonly complete: boolean;
  /** Its last part is all zeros. */
  readonly zeroTail: boolean;
  /** Why the file cannot be a recording, where its first bytes are there and say so. */
  readonly refused: string | null;
}

/** What is remembered of a file between two observations. */
export interface Settling {
  readonly seen: Omit<FileObservation, 'header' | 'monotonicMs'>;
  readonly firstSeenMs: number;
  /** Since when nothing changed. */
  readonly stillSinceMs: number;
}

export type SettlingVerdict =
  | { readonly verdict: 'wait'; readonly againInMs: number }
  /** Nothing changed for long enough: read the header and observe again with it. */
  | { readonly verdict: 'look' }
  | { readonly verdict: 'ready'; readonly zeroTail: boolean }
  | { readonly verdict: 'give-up'; readonly reason: string };

export interface SettlingWaits {
  readonly settleMs: number;
  readonly incompleteAfterMs: number;
}

/** The next state and what to do, from the state before (null: never seen) and what is seen now. */
export function settle(
  earlier: Settling | null,
  now: FileObservation,
  waits: SettlingWaits,
): { readonly state: Settling; readonly verdict: SettlingVerdict } {
  const { monotonicMs, header, ...seen } = now;
  const sameFile = earlier !== null && earlier.seen.inode === seen.inode;
  const still =
    sameFile &&
    earlier.seen.sizeBytes === seen.sizeBytes &&
    earlier.seen.modifiedMs === seen.modifiedMs &&
    earlier.seen.changedMs === seen.changedMs;
  const state: Settling = {
    seen,
    firstSeenMs: sameFile ? earlier.firstSeenMs : monotonicMs,
    stillSinceMs: still ? earlier.stillSinceMs : monotonicMs,
  };
  return { state, verdict: decide(state, monotonicMs, still ? header : null, waits) };
}

function decide(
  state: Settling,
  monotonicMs: number,
  header: HeaderLook | null,
  waits: SettlingWaits,
): SettlingVerdict {
  const giveUpAtMs = state.firstSeenMs + waits.incompleteAfterMs;
  const waited = printSeconds(waits.incompleteAfterMs / 1000);
  if (state.stillSinceMs > giveUpAtMs) {
    return {
      verdict: 'give-up',
      reason: `still growing after ${waited}; lengthen incomplete_after if the logger writes that long`,
    };
  }
  const stillMs = monotonicMs - state.stillSinceMs;
  if (stillMs < waits.settleMs) return { verdict: 'wait', againInMs: waits.settleMs - stillMs };
  if (header === null) return { verdict: 'look' };
  if (header.complete && header.refused === null && !header.zeroTail) {
    return { verdict: 'ready', zeroTail: false };
  }
  // The first bytes are there and say that this is no recording; nothing that still comes can change that.
  if (header.refused !== null && header.complete) return { verdict: 'give-up', reason: header.refused };
  if (monotonicMs < giveUpAtMs) return { verdict: 'wait', againInMs: giveUpAtMs - monotonicMs };
  if (header.complete) return { verdict: 'ready', zeroTail: true };
  return {
    verdict: 'give-up',
    reason: header.refused ?? incompleteReason(state.seen.sizeBytes, waited),
  };
}

function incompleteReason(sizeBytes: number, waited: string): string {
  return sizeBytes === 0
    ? `empty for ${waited}; the logger began the file and wrote nothing`
    : `shorter than its own header says for ${waited} (${sizeBytes} bytes); copy it again from the logger`;
}

/**
 * What a header pass means for settling. An empty file, or one whose first bytes are all zeros, may only be reserved
 * yet, so its refusal does not count before the wait is over.
 */
export function headerLook(
  answer: RecordingHeader | Refusal,
  sizeBytes: number,
  headIsZeros: boolean,
  zeroTail: boolean,
): HeaderLook {
  if ('refused' in answer) {
    return { complete: sizeBytes > 0 && !headIsZeros, zeroTail, refused: answer.reason };
  }
  const reserved = answer.zeroTail === true;
  return { complete: answer.complete || reserved, zeroTail: zeroTail || reserved, refused: null };
}

/** Bytes at the end of a file that are looked at for zeros. */
export const tailBytes = 4096;

export function allZeros(bytes: Uint8Array): boolean {
  return bytes.every((byte) => byte === 0);
}
