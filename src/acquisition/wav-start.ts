import type { StatedStart } from './recording.ts';

/** Bytes of a 'bext' chunk up to the end of its origination time. */
export const broadcastStartBytes = 338;

const dateOffset = 320;
const timeOffset = 330;

/**
 * Start that a Broadcast Wave 'bext' chunk states (EBU Tech 3285: OriginationDate yyyy-mm-dd at byte 320,
 * OriginationTime hh:mm:ss at byte 330; '-', '_', ':', ' ', '.' may separate). It names no zone. Null where it is
 * left blank, text where it makes no sense.
 */
export function broadcastStart(payload: Uint8Array): StatedStart | null | string {
  if (payload.length < broadcastStartBytes) return `${payload.length} bytes, too short for a date`;
  const date = String.fromCharCode(...payload.subarray(dateOffset, timeOffset));
  const time = String.fromCharCode(...payload.subarray(timeOffset, broadcastStartBytes));
  if (/^[\0 ]*$/.test(date)) return null;
  const day = /^(\d{4})[-_: .](\d\d)[-_: .](\d\d)$/.exec(date);
  const clock = /^(\d\d)[-_: .](\d\d)[-_: .](\d\d)$/.exec(time);
  if (day === null || clock === null) return 'its date and time cannot be read, start not taken from it';
  const [year, month, dayOfMonth] = day.slice(1).map(Number);
  const [hour, minute, second] = clock.slice(1).map(Number);
  const ms = Date.UTC(year, month - 1, dayOfMonth, hour, minute, second);
  const read = new Date(ms);
  const possible = read.getUTCMonth() === month - 1 && read.getUTCDate() === dayOfMonth;
  if (!possible || minute > 59 || second > 59 || year < 1970) {
    return `there is no date ${date} ${time}, start not taken from it`;
  }
  return { ms, zoned: false, origin: 'header' };
}
