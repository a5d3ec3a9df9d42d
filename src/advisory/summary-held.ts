import { chatteringRecordings, longStandingMs } from '../detection/alarm-history.ts';
import { clip } from './escape.ts';
import type { MachineFacts, PointFacts, StandingAlarm, TroubleFacts } from './facts.ts';
import type { SummaryFacts } from './summary-facts.ts';
import { durationText, momentText } from './time-words.ts';
import { foreign, idText, isReturned, placeText } from './wording.ts';

/** What is out of service, and the alarms that ask for a plan: those that come and go, those that stand for weeks. */
export interface OutOfServiceFacts {
  readonly machine: MachineFacts;
  /** Null: the machine with all its points. */
  readonly point: PointFacts | null;
  readonly untilMs: number;
  readonly by: string;
  readonly comment: string;
}

export interface ChatteringFacts {
  readonly number: number;
  readonly machine: MachineFacts;
  readonly point: PointFacts;
  readonly bandId: string;
  readonly returns: number;
}

const mostNamed = 5;

export function outOfServiceLines({ outOfService = [], site }: SummaryFacts): string[] {
  if (outOfService.length === 0) return [];
  const named = outOfService.map(
    ({ machine, point, untilMs, by, comment }) =>
      `${placeText(machine, point)} until ${momentText(untilMs, site.timeZone)}, by ${clip(by, 48)}: ${foreign(comment)}`,
  );
  return [`Out of service: ${listed(named)}.`];
}

/** Each asks for a plan (ANSI/ISA-18.2-2016); what could be done stands in `humledger alarms`. */
export function planLines(facts: SummaryFacts): string[] {
  const { chattering = [], standing, writtenMs } = facts;
  const lines: string[] = [];
  if (chattering.length > 0) {
    const named = chattering.map(
      ({ number, machine, point, bandId, returns }) =>
        `${number} ${placeText(machine, point)}, ${idText(bandId)} (${returns} returns)`,
    );
    lines.push(
      `Come and go within ${chatteringRecordings} recordings: ${listed(named)}; a wider deadband or a longer on_delay, or mend the machine.`,
    );
  }
  const old = standing.filter((item) => stands(item) && writtenMs - item.sinceMs > longStandingMs);
  if (old.length > 0) {
    const named = old.map(
      (item) => `${item.number} ${whereOf(item)} (${durationText(writtenMs - item.sinceMs)})`,
    );
    lines.push(`Stand for more than two weeks: ${listed(named)}.`);
  }
  return lines;
}

function stands(item: StandingAlarm | TroubleFacts): boolean {
  return !isReturned(item) && item.standing !== 'normal' && item.standing !== 'latched-acknowledged';
}

function whereOf({ machine, point }: StandingAlarm | TroubleFacts): string {
  return machine === null ? 'of logger, files or service' : placeText(machine, point);
}

function listed(named: readonly string[]): string {
  const rest = named.length - mostNamed;
  return `${named.slice(0, mostNamed).join('; ')}${rest > 0 ? `; and ${rest} more` : ''}`;
}
