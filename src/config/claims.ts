import type { BuiltPoint } from './build-point.ts';
import { commonName, type ExpandedPattern, expandPattern } from './file-pattern.ts';
import type { Build } from './layers.ts';
import { shorten } from './quantity.ts';
import { pointPath } from './site.ts';

interface Claim {
  readonly built: BuiltPoint;
  readonly pattern: ExpandedPattern;
  /** Literal text before the first <any>. */
  readonly head: string;
  readonly length: number;
}

/** Steps of comparing patterns in one file: some seconds. A site of 2000 points needs a hundredth. */
const mostSteps = 2e8;

/**
 * Two points that may take the same channel of the same file: the pattern of one file name that both take is the
 * proof. Patterns are compared with the ids in place, so `<machine><any>.wav` of blower-1 also takes what blower-10
 * sends.
 */
export function tellDoubleClaims(build: Build, points: readonly BuiltPoint[]): void {
  const byChannel = new Map<string, BuiltPoint[]>();
  for (const built of points) {
    const channel = String(built.point.channel);
    const group = byChannel.get(channel);
    if (group === undefined) byChannel.set(channel, [built]);
    else group.push(built);
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
        if (pointPath(earlier.built.point) === pointPath(claim.built.point)) continue;
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

function claimOf(built: BuiltPoint): Claim[] {
  const { point } = built;
  if (point.recordings.files === null) return [];
  const pattern = expandPattern(point.recordings.files, point.machineId, point.id);
  const first = pattern.indexOf(null);
  const head = pattern.slice(0, first < 0 ? pattern.length : first).join('');
  const length = pattern.reduce((sum, part) => sum + (part?.length ?? 1), 1);
  return [{ built, pattern, head, length }];
}

function tellEqualRegexes(build: Build, group: readonly BuiltPoint[]): void {
  const seen = new Map<string, BuiltPoint>();
  for (const built of group) {
    const regex = built.point.recordings.filesRegex;
    if (regex === null) continue;
    const earlier = seen.get(regex);
    if (earlier === undefined) seen.set(regex, built);
    else tell(build, earlier, built, `by the same files_regex`);
  }
}

function tell({ reading }: Build, one: BuiltPoint, other: BuiltPoint, file: string): void {
  const [first, second] = one.channelAt.from <= other.channelAt.from ? [one, other] : [other, one];
  const { channel } = second.point;
  const what = `${pointPath(second.point)} and ${pointPath(first.point)} (line ${reading.lineOf(first.channelAt)}) claim channel ${channel} of the same file, such as ${file}`;
  const another = typeof channel === 'number' ? String(channel + 1) : 'the name of another column';
  const written =
    second.channelAt === second.idAt ? `add: channel: ${another}` : reading.write(second.channelAt, another);
  reading.problem(
    second.channelAt,
    what,
    `${written}, or tell the files apart by <machine>_ and <point>_ in files:`,
  );
}
