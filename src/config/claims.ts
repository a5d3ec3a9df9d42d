import type { BuiltMachine } from './build-machines.ts';
import type { BuiltPoint } from './build-point.ts';
import { commonName, type ExpandedPattern, expandPattern } from './file-pattern.ts';
import type { Build } from './layers.ts';
import { shorten } from './quantity.ts';
import { type Point, pointPath } from './site.ts';
import type { Span } from './site-text.ts';

/** A point, or the pulses of a machine: takes one channel of the files of a point. */
interface Claimant {
  /** As people name it. */
  readonly name: string;
  readonly isPulses: boolean;
  readonly point: Point;
  readonly channel: number | string;
  readonly channelAt: Span;
  /** False where the channel is not written: 1. */
  readonly isWritten: boolean;
}

interface Claim {
  readonly built: Claimant;
  readonly pattern: ExpandedPattern;
  /** Literal text before the first <any>. */
  readonly head: string;
  readonly length: number;
}

/** Steps of comparing patterns in one file: some seconds. A site of 2000 points needs a hundredth. */
const mostSteps = 2e8;

/**
 * Two points that may take the same channel of the same file, or a point that takes a machine's pulses for vibration:
 * the pattern of one file name that both take is the proof. Patterns are compared with the ids in place, so
 * `<machine><any>.wav` of blower-1 also takes what blower-10 sends. Machines on one shaft may share their pulses.
 */
export function tellDoubleClaims(build: Build, machines: readonly BuiltMachine[]): void {
  const byChannel = new Map<string, Claimant[]>();
  for (const claimant of machines.flatMap((one) => [...one.points.map(claimantOf), ...pulseClaimants(one)])) {
    const channel = String(claimant.channel);
    const group = byChannel.get(channel);
    if (group === undefined) byChannel.set(channel, [claimant]);
    else group.push(claimant);
  }
  let left = mostSteps;
  for (const group of byChannel.values()) {
    tellEqualRegexes(build, group);
    const claims = group.flatMap(claimOf).sort((a, b) => (a.head < b.head ? -1 : a.head > b.head ? 1 : 0));
    // Sorted by head: a pattern can only meet those before it whose head begins its own.
    let open: Claim[] = [];
    for (const claim of claims) {
      open = open.filter(({ head }) => claim.head.startsWith(head));
      for (const earlier of open) {
        // Doubled ids are told already.
        if (earlier.built.name === claim.built.name) continue;
        if (earlier.built.isPulses && claim.built.isPulses) continue;
        if (left <= 0) break;
        left -= earlier.length * claim.length;
        const name = commonName(earlier.pattern, claim.pattern);
        if (name !== null) {
          tell(build, earlier.built, claim.built, `'${shorten(name)}'`);
          break;
        }
      }
      open.push(claim);
    }
  }
  if (left <= 0) {
    const text = 'too many file patterns to compare each with each: some doubled channels may not be told';
    build.reading.warn({ from: 0, to: 0 }, text);
  }
}

function claimantOf({ point, channelAt, idAt }: BuiltPoint): Claimant {
  const { channel } = point;
  return {
    name: pointPath(point),
    isPulses: false,
    point,
    channel,
    channelAt,
    isWritten: channelAt !== idAt,
  };
}

/** The pulses are read from every file that a point of the machine takes. */
function pulseClaimants({ machine, points, pulsesAt }: BuiltMachine): Claimant[] {
  const { pulses } = machine.speed;
  if (pulses === null || pulsesAt === null) return [];
  const name = `the pulses of ${machine.id}`;
  return points.map(({ point }) => ({
    name,
    isPulses: true,
    point,
    channel: pulses.channel,
    channelAt: pulsesAt,
    isWritten: true,
  }));
}

function claimOf(built: Claimant): Claim[] {
  const { point } = built;
  if (point.recordings.files === null) return [];
  const pattern = expandPattern(point.recordings.files, point.machineId, point.id);
  const first = pattern.indexOf(null);
  const head = pattern.slice(0, first < 0 ? pattern.length : first).join('');
  const length = pattern.reduce((sum, part) => sum + (part?.length ?? 1), 1);
  return [{ built, pattern, head, length }];
}

function tellEqualRegexes(build: Build, group: readonly Claimant[]): void {
  const seen = new Map<string, Claimant>();
  for (const built of group) {
    const regex = built.point.recordings.filesRegex;
    if (regex === null) continue;
    const earlier = seen.get(regex);
    if (earlier === undefined) seen.set(regex, built);
    else if (!earlier.isPulses || !built.isPulses) tell(build, earlier, built, `by the same files_regex`);
  }
}

function tell({ reading }: Build, one: Claimant, other: Claimant, file: string): void {
  const [first, second] = one.channelAt.from <= other.channelAt.from ? [one, other] : [other, one];
  const { channel } = second;
  const what = `${second.name} and ${first.name} (line ${reading.lineOf(first.channelAt)}) claim channel ${channel} of the same file, such as ${file}`;
  const another = typeof channel === 'number' ? String(channel + 1) : 'the name of another column';
  const written = second.isWritten ? reading.write(second.channelAt, another) : `add: channel: ${another}`;
  reading.problem(
    second.channelAt,
    what,
    `${written}, or tell the files apart by <machine>_ and <point>_ in files:`,
  );
}
