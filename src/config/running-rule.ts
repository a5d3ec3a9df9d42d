import { type Level, parseLevel } from './level.ts';
import { type Parsed, parseFrequency, refused, shorten, understood } from './quantity.ts';

/** `running:` as written; the band of a level is looked up where the machine's points are known. */
export type WrittenRunning =
  | { readonly by: 'speed'; readonly aboveRpm: number }
  | { readonly by: 'sidecar' }
  | { readonly by: 'level'; readonly bandId: string; readonly above: Level };

/** `speed above 300 rpm`, `sidecar`, or `level of BAND above 0.5 mm/s`. */
export function parseRunning(text: string): Parsed<WrittenRunning> {
  const written = text.trim().replace(/\s+/g, ' ');
  if (written === 'sidecar') return understood({ by: 'sidecar' });
  const speed = /^speed above (.+)$/.exec(written);
  if (speed !== null) {
    const hz = parseFrequency(speed[1], 'rpm');
    if (!hz.ok) return refused(hz.what, hz.instead === null ? null : `speed above ${hz.instead}`);
    if (!(hz.value > 0))
      return refused(`'${shorten(written)}': a machine runs above 0 rpm`, 'speed above 300 rpm');
    return understood({ by: 'speed', aboveRpm: Number((hz.value * 60).toPrecision(12)) });
  }
  const level = /^level of (\S+) above (.+)$/.exec(written);
  if (level !== null) {
    const above = parseLevel(level[2]);
    if (!above.ok)
      return refused(
        above.what,
        above.instead === null ? null : `level of ${level[1]} above ${above.instead}`,
      );
    if (!(above.value.value > 0)) return refused(`'${shorten(written)}': a level is above 0`);
    return understood({ by: 'level', bandId: level[1], above: above.value });
  }
  return refused(
    `'${shorten(text)}' is none of 'speed above 300 rpm', 'sidecar', 'level of BAND above 0.5 mm/s'`,
    /^\d/.test(written) ? `speed above ${written}` : null,
  );
}
