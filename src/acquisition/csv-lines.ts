import type { ByteSource } from './recording.ts';

export const longestLineBytes = 65_536;
const usualBounds = { longest: longestLineBytes, buffer: 4 * longestLineBytes };

/** Where the current line lies in `bytes`; valid until the next call. */
export interface Lines {
  readonly bytes: Uint8Array;
  start: number;
  end: number;
  /** Counted from 1. */
  number: number;
  /** Where in the file the next line begins. */
  behind: number;
  /** False for a last line without a line end: perhaps cut short. */
  ended: boolean;
  /** Set when a line passed the bound; no line follows. */
  tooLong: boolean;
  /** To the next line; false behind the last one. */
  next(): boolean;
}

/**
 * Lines of a text through one buffer of fixed size, read from front to back. `lineEnd` is LF (a CR ahead of it is
 * cut off) or, for texts that know only that, CR; `from` is where the text begins, behind a byte-order mark.
 * `longest` bounds a line, `buffer` the bytes held at a time.
 */
export function linesOf(
  source: ByteSource,
  lineEnd: number,
  from: number,
  { longest, buffer }: { readonly longest: number; readonly buffer: number } = usualBounds,
): Lines {
  const bytes = new Uint8Array(Math.min(buffer, Math.max(1, source.size)));
  let filled = 0;
  let nextStart = 0;
  let readTo = from;

  const refill = (): boolean => {
    bytes.copyWithin(0, nextStart, filled);
    filled -= nextStart;
    nextStart = 0;
    const room = Math.min(bytes.length - filled, source.size - readTo);
    const count = room > 0 ? source.read(readTo, bytes.subarray(filled, filled + room)) : 0;
    if (count <= 0) return false;
    readTo += count;
    filled += count;
    return true;
  };

  const give = (end: number, ended: boolean): boolean => {
    lines.start = nextStart;
    lines.end = ended && lineEnd === 0x0a && end > nextStart && bytes[end - 1] === 0x0d ? end - 1 : end;
    lines.ended = ended;
    lines.number++;
    nextStart = ended ? end + 1 : end;
    lines.behind = readTo - filled + nextStart;
    return true;
  };

  const lines: Lines = {
    bytes,
    start: 0,
    end: 0,
    number: 0,
    behind: from,
    ended: true,
    tooLong: false,
    next() {
      if (lines.tooLong) return false;
      let searched = nextStart;
      for (;;) {
        const end = bytes.indexOf(lineEnd, searched);
        if (end >= 0 && end < filled) {
          if (end - nextStart <= longest) return give(end, true);
        } else if (filled - nextStart <= longest) {
          searched = filled - nextStart;
          if (refill()) continue;
          return filled > nextStart && give(filled, false);
        }
        lines.start = nextStart;
        lines.end = nextStart + longest;
        lines.number++;
        lines.tooLong = true;
        return false;
      }
    },
  };
  return lines;
}
