import { instantsOf, offsetMs } from '../config/local-time.ts';
import type { RecordingSettings } from '../config/site.ts';
import type { StartOrigin, StatedStart } from './recording.ts';
import { realDateMs } from './start-in-name.ts';

/** Everything that may state when a recording began; null: does not say. */
export interface StartQuestion {
  readonly sidecar: StatedStart | null;
  readonly fileName: StatedStart | null;
  /** From the file's own header or its time column. */
  readonly header: StatedStart | null;
  readonly modifiedMs: number;
  readonly clock: RecordingSettings['clock'];
  /** IANA name of the site's zone. */
  readonly siteZone: string;
  /** Stated start of the recording before this one in the same series of names, to tell a repeated hour's two readings apart. */
  readonly previousMs: number | null;
}

export interface RecordingStart {
  /** What the recording says of itself; null where only the file's time of change is left. */
  readonly statedMs: number | null;
  /** The stated start, or else the time of change. */
  readonly startMs: number;
  readonly origin: StartOrigin;
  /**
   * The other instant that the same reading names in an hour that is repeated when summer time ends; null otherwise.
   * A file that comes again may have been kept under it.
   */
  readonly otherMs: number | null;
  /** What was odd about the reading, for people. */
  readonly remark: string | null;
}

/** Start of a recording: the sidecar's word goes before the file name's, then the header's, then the time of change. */
export function recordingStart(question: StartQuestion): RecordingStart {
  const stated = question.sidecar ?? question.fileName ?? question.header;
  if (stated === null) {
    const startMs = Math.round(question.modifiedMs);
    return { statedMs: null, startMs, origin: 'modification-time', otherMs: null, remark: null };
  }
  const { ms, otherMs, remark } = stated.zoned
    ? { ms: stated.ms, otherMs: null, remark: null }
    : instantOfReading(stated.ms, question.clock, question.siteZone, question.previousMs);
  return { statedMs: Math.round(ms), startMs: Math.round(ms), origin: stated.origin, otherMs, remark };
}

/**
 * The instant that a logger's clock meant by a reading (wall-clock fields as if they were UTC).
 *
 * In the hour that comes twice, the first of the two instants that lies after the previous recording; without one
 * the first. A reading that the zone's clocks skip is read with the offset before the change, as a clock that was
 * not yet put forward shows it.
 */
export function instantOfReading(
  reading: number,
  clock: RecordingSettings['clock'],
  siteZone: string,
  previousMs: number | null,
): { readonly ms: number; readonly otherMs: number | null; readonly remark: string | null } {
  if (clock.kind === 'utc') return { ms: reading, otherMs: null, remark: null };
  if (clock.kind === 'offset') return { ms: reading - clock.minutes * 60_000, otherMs: null, remark: null };
  // Zone offsets are looked up for whole seconds; a fraction takes no part in them.
  const fraction = reading - Math.floor(reading / 1000) * 1000;
  const instants = instantsOf(reading - fraction, siteZone).map((ms) => ms + fraction);
  if (instants.length === 0) {
    const ms = reading - offsetMs(reading - 86_400_000, siteZone);
    return { ms, otherMs: null, remark: 'its local time is one that the change to summer time skips' };
  }
  const [first, second] = instants;
  if (second === undefined) return { ms: first, otherMs: null, remark: null };
  const later = previousMs !== null && first <= previousMs && second > previousMs;
  return {
    ms: later ? second : first,
    otherMs: later ? first : second,
    remark: `its local time comes twice when summer time ends; taken as the ${later ? 'second' : 'first'}`,
  };
}

/**
 * A date and time in ISO 8601 form: `2026-11-03T09:30:00Z`, `...+01:00`, `2026-11-03 09:30:00.250`; seconds may be
 * missing. Null where it is none, or no such date exists.
 */
export function parseIsoStart(text: string, origin: StartOrigin): StatedStart | null {
  const match =
    /^(\d{4})-(\d\d)-(\d\d)[T ](\d\d):(\d\d)(?::(\d\d)(?:[.,](\d{1,9}))?)?\s?(Z|[+-]\d\d(?::?\d\d)?)?$/.exec(
      text,
    );
  if (match === null) return null;
  const [year, month, day, hour, minute] = match.slice(1, 6).map(Number);
  const second = Number(match[6] ?? 0);
  const whole = realDateMs(year, month, day, hour, minute, second);
  if (whole === null) return null;
  const ms = whole + Number(`0.${match[7] ?? 0}`) * 1000;
  const zone = match[8];
  if (zone === undefined) return { ms, zoned: false, origin };
  if (zone === 'Z') return { ms, zoned: true, origin };
  const [hours, minutes] = [Number(zone.slice(1, 3)), Number(zone.slice(3).replace(':', '') || 0)];
  if (hours > 14 || minutes > 59) return null;
  const eastMinutes = (zone.startsWith('-') ? -1 : 1) * (60 * hours + minutes);
  return { ms: ms - eastMinutes * 60_000, zoned: true, origin };
}
