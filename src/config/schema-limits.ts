import { isScalar, type Node } from 'yaml';
import { type Parsed, parseDelay, parsePercent, refused, shorten, understood } from './quantity.ts';
import type { Reading } from './reading.ts';
import { addresses, duration, durationOrNever, formerIds, frequency, id, percent } from './schema-values.ts';
import { choice, list, plainNumber, type Shape, scalar, trueOrFalse, type Written, words } from './shape.ts';
import { key, map, type ReadMap } from './shape-map.ts';
import type { LimitKind } from './site.ts';
import { suppressedWhileKey } from './suppressed-while.ts';

const hour = 3_600_000;
const day = 24 * hour;

/** A limit's value is understood where its band's quantity is known. */
const levelText = scalar((text) => understood(text.trim()), { example: '2.8 mm/s', most: 60 });

const delay = scalar(parseDelay, { example: '2 recordings' });

/** '+25 %', or 'never' (null). */
function parseSayAgain(text: string): Parsed<number | null> {
  if (text.trim() === 'never') return understood(null);
  const parsed = parsePercent(text);
  if (!parsed.ok) return parsed;
  if (parsed.value >= 1 && parsed.value <= 1000) return parsed;
  return refused(`'${shorten(text)}' is not from +1 % to +1000 %, or never`);
}

/** Later kinds of limit each add one word here, their own keys, and one entry where limits are built. */
export const limitKinds = [
  'fixed',
  'zone',
  'baseline',
  'statistical',
  'change',
  'rate',
  'curve',
] as const satisfies readonly LimitKind[];

/** One value of a curve; straight lines lie between them. */
const curveKeys = {
  speed: key(frequency(0.01, 5000, '1500 rpm'), 'Running speed at which it holds.'),
  load: key(percent(0, 1000, '60 %'), 'Or the load.'),
  alert: key(levelText, 'The lower severity.'),
  danger: key(levelText, 'The higher severity.'),
};

export const limitKeys = {
  id: key(id('overall-fixed-upper'), 'Names the limit.', { fallback: 'band-kind-side' }),
  formerly: key(formerIds, 'Earlier ids: standing alarms are carried over.'),
  band: key(id('overall'), 'The band whose level is judged.', { required: true }),
  kind: key(
    choice(limitKinds),
    "fixed: the values as they stand; zone: from the boundaries of the machine's evaluation zones; baseline: multiples of what is usual; statistical: spreads above what is usual; change: away from what is usual, up or down; rate: growth over a time; curve: over speed or load.",
    { fallback: 'fixed' },
  ),
  side: key(choice(['upper', 'lower']), 'upper: too much; lower: too little.', { fallback: 'upper' }),
  alert: key(levelText, 'The lower severity: a level; kind baseline also 2.5x or +8 dB, kind rate 50 %.'),
  danger: key(levelText, 'The higher severity, likewise.'),
  k: key(plainNumber(1, 20, false, '4.5'), 'Kind statistical: spreads from the median to the alert.', {
    fallback: '4.5',
  }),
  danger_k: key(plainNumber(1, 40, false, '8'), 'Kind statistical: spreads from the median to the danger.'),
  over: key(duration(hour, 365 * day, '7 d'), 'Kind rate: the time over which the growth is reckoned.', {
    fallback: '7 d',
  }),
  curve: key(list(map(curveKeys), 50), 'Kind curve: its values, speed or load growing.'),
  confidence: key(
    percent(50, 99.9, '95 %'),
    "An alert counts only where the level's whole interval is past the limit; a danger never waits for that.",
  ),
  conditions: key(list(id('full-load'), 50), 'Only in these operating conditions of the machine.', {
    fallback: 'in all',
  }),
  baseline: key(
    levelText,
    'Kind zone: the level while the machine was known to be good; the alert stands 25 % of B/C above it.',
    { fallback: 'the alert stands at B/C' },
  ),
  on_delay: key(
    delay,
    'The level must stay over the limit for so many recordings, or so long: single knocks raise nothing.',
    {
      fallback: '2 recordings; kind statistical 3 recordings',
    },
  ),
  off_delay: key(delay, 'The level must stay below for so many recordings, or so long.', {
    fallback: '1 recordings',
  }),
  deadband: key(percent(0, 50, '10 %'), 'The level must fall this far below the limit, in percent of it.', {
    fallback: '10 %',
  }),
  suppressed_while: suppressedWhileKey,
  latching: key(trueOrFalse, 'The alarm stands until it is reset by hand.', { fallback: 'false' }),
  say_again_at: key(
    scalar(parseSayAgain, { example: '+25 %' }),
    'An acknowledged alarm is told again when its level has risen by this much; or never.',
    {
      fallback: '+25 %',
    },
  ),
  say_again_after: key(
    durationOrNever(hour, 365 * day, '7 d'),
    'An acknowledged alarm that still stands so long afterwards is told again; or never.',
    { fallback: 'never' },
  ),
  remind_after: key(
    durationOrNever(5 * 60_000, 30 * day, '4 h'),
    'Reminder while nobody has acknowledged the alarm, repeated after growing pauses; or never.',
    { fallback: 'remind_after of mail' },
  ),
  then_to: key(addresses, 'Who is told as well when reminders have not helped, in this order.', {
    fallback: 'then_to of mail',
  }),
  action: key(
    words(1000, 'Check base bolts and coupling', { lines: true }),
    'What to do first, in the words of the site.',
  ),
  respond_within: key(duration(60_000, 365 * day, '2 d'), 'Time within which a person should have looked.'),
};

export type WrittenLimit = Written<ReadMap<typeof limitKeys>>;

/** A list of limits, or `from zones`: one of kind zone for each band that the machine's zone table judges. */
export interface WrittenLimits {
  readonly fromZones: boolean;
  readonly list: readonly WrittenLimit[];
}

const listed = list(map(limitKeys), 400);
const fromZones = choice(['from zones']);

export const limits: Shape<WrittenLimits> = {
  read(node: Node, name: string, reading: Reading): Written<WrittenLimits> | null {
    const resolved = reading.resolve(node);
    if (isScalar(resolved) && /\bzones?\b/i.test(String(resolved.value))) {
      const written = fromZones.read(node, name, reading);
      return written === null ? null : { value: { fromZones: true, list: [] }, at: written.at };
    }
    const written = listed.read(node, name, reading);
    return written === null ? null : { value: { fromZones: false, list: written.value }, at: written.at };
  },
  jsonSchema: { anyOf: [fromZones.jsonSchema, listed.jsonSchema] },
  example: listed.example,
  below: listed.below,
};
