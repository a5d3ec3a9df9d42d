import { gapsOfWeek, minutesADay, minutesOfWeek } from './hours.ts';
import type { Reading } from './reading.ts';
import type { Machine, Recipient, Severity } from './site.ts';
import type { Span } from './site-text.ts';

/** Warns of what nobody is told: machines or severities without a recipient, and hours of the week in which nobody's entry fits. */

const severities: readonly Severity[] = ['danger', 'alert', 'trouble'];
const mostNamed = 5;

export function tellUncovered(
  reading: Reading,
  at: Span,
  recipients: readonly Recipient[],
  machines: readonly Machine[],
): void {
  if (recipients.length === 0) return;
  // Machines of the same fate share one line.
  const fates = new Map<string, { readonly say: (who: string) => string; readonly ids: string[] }>();
  for (const machine of machines) {
    for (const [fate, say] of fatesOf(machine, recipients)) {
      const known = fates.get(fate);
      if (known === undefined) fates.set(fate, { say, ids: [machine.id] });
      else known.ids.push(machine.id);
    }
  }
  for (const { say, ids } of fates.values()) {
    const rest = ids.length > mostNamed ? ` and ${ids.length - mostNamed} more` : '';
    const all = ids.length === machines.length && ids.length > 1;
    reading.warn(at, say(all ? 'any machine' : `${ids.slice(0, mostNamed).join(', ')}${rest}`));
  }
}

function fatesOf(machine: Machine, recipients: readonly Recipient[]): [string, (who: string) => string][] {
  const never: Severity[] = [];
  const gaps = new Map<string, Severity[]>();
  for (const severity of severities) {
    const entries = recipients.filter((one) => takes(one, machine, severity));
    if (entries.length === 0) {
      never.push(severity);
      continue;
    }
    const gap = uncoveredHours(entries);
    if (gap !== '') gaps.set(gap, [...(gaps.get(gap) ?? []), severity]);
  }
  const fates: [string, (who: string) => string][] = [];
  if (never.length > 0) {
    const what = never.join(', ');
    fates.push([`never ${what}`, (who) => `nobody is told of ${what} of ${who}`]);
  }
  for (const [gap, of] of gaps) {
    const waits = of.some((severity) => severity !== 'danger');
    const then = [
      ...(waits ? [`${of.filter((one) => one !== 'danger').join(' and ')} wait until it is over`] : []),
      ...(of.includes('danger') ? ['danger then goes to everybody, whatever their hours'] : []),
    ];
    fates.push([`${gap} ${of}`, (who) => `nobody has hours for ${who} from ${gap}: ${then.join('; ')}`]);
  }
  return fates;
}

function takes(
  { machines, areas, severities: taken }: Recipient,
  machine: Machine,
  severity: Severity,
): boolean {
  return (
    (machines === null || machines.includes(machine.id)) &&
    (areas === null || (machine.area !== null && areas.includes(machine.area))) &&
    (taken === null || taken.includes(severity))
  );
}

/** 'sat 00:00 to mon 06:00'; '' where somebody's hours fit at any time. */
function uncoveredHours(entries: readonly Recipient[]): string {
  if (entries.some(({ hours }) => hours === undefined || hours === null)) return '';
  const covered = new Uint8Array(7 * minutesADay);
  for (const { hours } of entries) {
    if (hours === undefined || hours === null) continue;
    minutesOfWeek(hours).forEach((within, minute) => {
      if (within === 1) covered[minute] = 1;
    });
  }
  const gaps = gapsOfWeek(covered);
  const rest = gaps.length > 3 ? ` and ${gaps.length - 3} more times of the week` : '';
  return `${gaps.slice(0, 3).join(', ')}${rest}`;
}
