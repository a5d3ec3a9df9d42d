import { printNumber } from '../config/print-value.ts';
import { counted } from './level-words.ts';
import type { SummaryFacts } from './summary-facts.ts';
import { durationText, momentText } from './time-words.ts';
import { foreign, nameOf, placeText } from './wording.ts';

/** The counting sections of the summary: recordings, alarms, the service itself. */

export function recordingLines(facts: SummaryFacts): string[] {
  const { received, expected, repeats, late, quarantined, unassigned } = facts.recordings;
  const lines = [
    `${received} of ${expected} expected since ${momentText(facts.sinceMs, facts.site.timeZone)}.`,
  ];
  const odd: string[] = [];
  if (quarantined > 0) odd.push(`${quarantined} could not be used (quarantine)`);
  if (unassigned > 0) odd.push(`${unassigned} that no point takes`);
  if (late > 0) odd.push(`${late} late`);
  if (repeats > 0) odd.push(`${repeats} sent twice`);
  if (odd.length > 0) lines.push(`Besides: ${odd.join(', ')}.`);
  if (facts.longStopped.length > 0) {
    const named = facts.longStopped
      .slice(0, 3)
      .map(({ machine, sinceMs }) => `${nameOf(machine)} for ${durationText(facts.writtenMs - sinceMs)}`);
    const rest = facts.longStopped.length - named.length;
    lines.push(`Stopped longer than expected: ${named.join('; ')}${rest > 0 ? `; and ${rest} more` : ''}.`);
  }
  return lines;
}

export function historyLines({ history, limitsRemoved }: SummaryFacts): string[] {
  const lines = [`Yesterday ${history.yesterday}, in the last seven days ${history.week}.`];
  if (history.frequent.length > 0) {
    const named = history.frequent
      .slice(0, 3)
      .map(({ machine, point, count }) => `${placeText(machine, point)} (${count})`);
    lines.push(`Most often: ${named.join('; ')}.`);
  }
  if (limitsRemoved.length > 0) {
    const named = limitsRemoved.map(({ number, what }) => `${number} ${foreign(what)}`);
    lines.push(`Closed because the limit left the site file: ${named.join('; ')}.`);
  }
  return lines;
}

export function serviceLines({ service, site, writtenMs }: SummaryFacts): string[] {
  const up = `Up since ${momentText(service.upSinceMs, site.timeZone)} (${durationText(writtenMs - service.upSinceMs)}).`;
  return [up, mailLine(service, site.timeZone), storageLine(service, site.timeZone)];
}

function mailLine(service: SummaryFacts['service'], timeZone: string): string {
  const said = [
    service.mailLastAcceptedMs === null
      ? 'none accepted yet'
      : `last accepted ${momentText(service.mailLastAcceptedMs, timeZone)}`,
    `${service.mailWaiting} waiting`,
  ];
  if (service.mailFailed > 0) said.push(`${service.mailFailed} refused for good`);
  if (service.mailLastAnswer !== null) said.push(`last answer: ${foreign(service.mailLastAnswer)}`);
  return `Mail: ${said.join(', ')}.`;
}

function storageLine(service: SummaryFacts['service'], timeZone: string): string {
  const free = service.diskFreeBytes === null ? '' : ` (${printNumber(service.diskFreeBytes / 1e9)} GB free)`;
  const disk =
    service.diskDaysLeft === null
      ? `Disk: how long it lasts is not known yet${free}`
      : `Disk: lasts ${service.diskDaysLeft > 1000 ? 'more than 1000 days' : counted(Math.floor(service.diskDaysLeft), 'day')} at this rate${free}`;
  const backup =
    service.lastBackupMs === null
      ? 'no backup yet'
      : `last backup ${momentText(service.lastBackupMs, timeZone)}`;
  return `${disk}; ${backup}.`;
}
