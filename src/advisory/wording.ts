import type { JournalEventName, TroubleKind } from '../detection/alarm.ts';
import type { SpeedOrigin } from '../manipulation/measurement.ts';
import { clip } from './escape.ts';
import type { MachineFacts, PointFacts, SiteFacts, StandingFacts } from './facts.ts';
import { momentText } from './time-words.ts';

/** Sentences that people read, in one place; what is made of numbers is in level-words.ts and time-words.ts. */

/** Stands under every alarm mail, summary and page. */
export const caution =
  'Caution: this message advises, people decide. Alerts do not replace inspection by qualified maintenance personnel. ' +
  "The site sets the limits, following the machine's maker and the standards that apply. Before anyone approaches a " +
  'machine, lock-out and local rules apply. This is not a machinery protection system: it sees seconds in an hour and ' +
  'must never replace or drive a trip.';

/** Longest name that is shown whole: what stands behind it must stay on the screen. */
const longestName = 48;

export function nameOf(named: MachineFacts | PointFacts | SiteFacts): string {
  const name = clip(named.name, longestName).trim();
  return name === '' && 'id' in named ? clip(named.id, longestName) : name;
}

/** 'Aeration blower 1, drive end, horizontal'. */
export function placeText(machine: MachineFacts, point: PointFacts | null): string {
  return point === null ? nameOf(machine) : `${nameOf(machine)}, ${nameOf(point)}`;
}

/** An id of the site file, a band's for example. */
export function idText(id: string): string {
  return clip(id, longestName);
}

/** A text from outside (a reason, an answer, a comment) that may be long. */
export function foreign(text: string): string {
  return clip(text, 300);
}

/** What a trouble is called in a subject and a list. */
export const troubleName: Readonly<Record<TroubleKind, string>> = {
  overdue: 'overdue',
  'dead-sensor': 'dead sensor',
  'reads-stopped': 'reads stopped while its machine runs',
  unreadable: 'unreadable files',
  unassigned: 'files that no point takes',
  'wrong-rate': 'wrong sample rate',
  'uneven-time': 'uneven time column',
  'repeats-itself': 'logger repeats itself',
  clock: "logger's clock is wrong",
  'late-sidecar': 'sidecar came too late',
  'drop-folder': 'drop folder cannot be read',
  ledger: 'ledger cannot be written',
  'mail-refused': 'mail refused',
  'site-file': 'site file is wrong',
};

/** What to do about it, in the order in which it is quickest to try. */
export const troubleAdvice: Readonly<Record<TroubleKind, string>> = {
  overdue:
    'See whether the logger has power and still writes files, then whether they reach the drop folder (network, file share, full disk). Until then this point is blind.',
  'dead-sensor':
    "Check the sensor's cable and connectors, then its supply and bias voltage, then exchange the sensor. Until then this point is blind: its low level says nothing about the machine.",
  'reads-stopped':
    'Another point of this machine sees it running: check the cable, the connector and the mounting of this sensor.',
  unreadable:
    'Check how the logger ends and copies its files (full memory card, copying broken off, changed format). The files lie in quarantine with the reason beside each.',
  unassigned:
    "See 'humledger files' for the nearest pattern and where it differs; then mend the logger's file names or the pattern in the site file.",
  'wrong-rate':
    'Compare the sample rate in the logger with sample_rate in the site file. The levels are judged at the rate of the file itself, as a new series.',
  'uneven-time':
    'Check how the logger writes its time column, and whether samples are lost. They are not evenly spaced, so no spectrum can be made.',
  'repeats-itself':
    'Restart the logger, and check its input and its memory. It sends the same samples again and again.',
  clock:
    'Set the clock of the logger, and check its battery and time zone. Recordings are judged by the time of their arrival meanwhile.',
  'late-sidecar':
    'Let the logger write the sidecar before its recording. This one came after the recording had been judged.',
  'drop-folder':
    'Check that the folder exists, that its share is mounted and that the service may read it. No recording can be taken in meanwhile.',
  ledger:
    'Check free disk space and who else holds the ledger. Nothing can be judged or stored; recordings wait in the drop folder.',
  'mail-refused':
    'Check the address, the mail server and its login in the site file. Messages are not reaching everybody.',
  'site-file':
    "Run 'humledger check' and mend the lines that it names. The last good site file stays in force.",
};

/** The first sentence of the advice, for the summary, which must stay on a screen. */
export function shortAdvice(trouble: TroubleKind): string {
  const advice = troubleAdvice[trouble];
  const end = advice.indexOf('. ');
  return end === -1 ? advice : advice.slice(0, end + 1);
}

/** What happened, where the severity alone does not say it; null where it does. */
export function eventText(event: JournalEventName): string | null {
  return events[event] ?? null;
}

const events: Readonly<Partial<Record<JournalEventName, string>>> = {
  rose: 'Risen from alert to danger.',
  fell: 'Fallen from danger to alert.',
  returned: 'Back to normal.',
  'said-again': 'Told again: the level has got worse since it was last told.',
  'still-stands': 'Told again: it was acknowledged, and it still stands.',
  reminded: 'Reminder: nobody has acknowledged this yet.',
  'danger-unconfirmed': 'Over the danger limit, not yet confirmed by a further recording.',
  'exceeded-came-late':
    'Found in a recording that came late; the state of the alarm follows newer recordings and is unchanged.',
  'limit-removed':
    'The limit has been taken out of the site file: the alarm is closed, although nobody had acknowledged the danger.',
  'shelf-expired': 'The time on the shelf is over and the alarm still stands.',
  unshelved: 'Taken off its shelf, and the alarm still stands.',
  'in-service': 'Out of service until now, and the alarm still stands.',
  unsuppressed: 'Held back by design until now, and the alarm still stands.',
};

/** 'unacknowledged', 'acknowledged by K. Example, Tue 1 Dec 2026, 06:30', 'shelved until ...'. */
export function standingText(facts: StandingFacts, timeZone: string): string {
  const held = heldText(facts, timeZone);
  switch (facts.standing) {
    case 'acknowledged':
    case 'latched-acknowledged': {
      const by = facts.acknowledgedBy === null ? '' : ` by ${clip(facts.acknowledgedBy, longestName)}`;
      const at = facts.acknowledgedMs === null ? '' : `, ${momentText(facts.acknowledgedMs, timeZone)}`;
      return `${facts.standing === 'acknowledged' ? '' : 'latched until reset, '}acknowledged${by}${at}`;
    }
    case 'returned-unacknowledged':
      return 'back to normal, unacknowledged';
    case 'latched-unacknowledged':
      return 'back to normal but latched, unacknowledged';
    case 'shelved':
      return `shelved${held}`;
    case 'suppressed':
      return `suppressed by design${held}`;
    case 'out-of-service':
      return `out of service${held}`;
    default:
      return facts.standing;
  }
}

/** ' until Tue 1 Dec 2026, 06:30, by K. Example: new seal'; ': trouble of pump-2/de-v'. */
function heldText(
  { suppressedUntilMs, suppressedBy, suppressedWhy }: StandingFacts,
  timeZone: string,
): string {
  const until = suppressedUntilMs === null ? '' : ` until ${momentText(suppressedUntilMs, timeZone)}`;
  const by = suppressedBy == null ? '' : `, by ${clip(suppressedBy, longestName)}`;
  const why = suppressedWhy == null ? '' : `: ${clip(suppressedWhy, 80)}`;
  return `${until}${by}${why}`;
}

/** For alarms that no longer exceed and still wait for a person. */
export function isReturned(facts: StandingFacts): boolean {
  return facts.standing === 'returned-unacknowledged' || facts.standing === 'latched-unacknowledged';
}

export function acknowledgeCommand(number: number | 'NUMBER'): string {
  return `humledger alarms acknowledge ${number} --by NAME`;
}

/** Names the zone once for all times of a message. */
export function zoneText(timeZone: string): string {
  return `Times are those of ${clip(timeZone, longestName)}.`;
}

export const speedOrigin = {
  sidecar: 'from the sidecar',
  pulses: 'from its pulses',
  spectrum: 'found in the spectrum',
  nominal: 'nominal, not measured',
} as const satisfies Readonly<Record<SpeedOrigin, string>>;
