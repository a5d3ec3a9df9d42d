import { printDuration } from '../config/print-value.ts';
import type { Delay } from '../config/site.ts';
import { counted } from './level-words.ts';
import { durationText } from './time-words.ts';

/** Of alarms that come and go, or that stand for weeks: each asks for a plan, not for one more mail. */
export interface ChatterFacts {
  readonly returns: number;
  /** Within so many recordings. */
  readonly recordings: number;
  /** What the site file says now; null where the limit has left it. */
  readonly deadbandPercent: number | null;
  readonly onDelay: Delay | null;
}

/** 'came back 3 times within 24 recordings'. */
export function chatterText({ returns, recordings }: Pick<ChatterFacts, 'returns' | 'recordings'>): string {
  return `came back ${returns} times within ${recordings} recordings`;
}

/** What could be done about it in the site file, where the machine itself does not do it. */
export function chatterAdvice({ deadbandPercent, onDelay }: ChatterFacts): string {
  const now = [
    `a wider deadband${deadbandPercent === null ? '' : ` (now ${deadbandPercent} %)`}`,
    `a longer on_delay${onDelay === null ? '' : ` (now ${delayText(onDelay)})`}`,
  ];
  return `${now.join(' or ')}, unless the machine itself comes and goes`;
}

/** In its mail: what is meant, what follows from it, what to do. */
export function chatteringSaid(chatter: ChatterFacts): string {
  const advice = chatterAdvice(chatter);
  return (
    `it ${chatterText(chatter)}. Until that stops it is not mailed each time; a danger always is. ` +
    `It needs a plan: ${advice}.`
  );
}

/** 'stands for 16 d'. */
export function longStandingText(sinceMs: number, nowMs: number): string {
  return `stands for ${durationText(nowMs - sinceMs)}: mend it, or let the limit say what is usual`;
}

function delayText(delay: Delay): string {
  return 'recordings' in delay ? counted(delay.recordings, 'recording') : printDuration(delay.ms);
}
