import { parseDisplayUnit } from './level.ts';
import {
  type Parsed,
  parseDelay,
  parseEdge,
  parsePercent,
  parsePhysical,
  refused,
  shorten,
  understood,
} from './quantity.ts';
import { parseRunning } from './running-rule.ts';
import { analysis, areaName, recordings } from './schema-recordings.ts';
import { duration, formerIds, frequency, id, percent } from './schema-values.ts';
import { parseSensitivity } from './sensitivity.ts';
import { choice, list, ruled, scalar, trueOrFalse, words } from './shape.ts';
import { key, map, mapById } from './shape-map.ts';
import type { Quantity } from './site.ts';

const day = 86_400_000;

const quantities = [
  'acceleration',
  'velocity',
  'displacement',
  'sound-pressure',
  'voltage',
  'current',
  'other',
] as const satisfies readonly Quantity[];

const edge = scalar(
  ruled(parseEdge, ({ value }) =>
    value >= 0 && value <= 5e6 ? null : { what: 'is not from 0 to 5 MHz', instead: null },
  ),
  { example: '10 Hz', pattern: '^[0-9.]+\\s*(Hz|kHz|rpm|r/min|1/min|x)$' },
);

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

export const bandKeys = {
  id: key(id('overall'), 'Names the band in limits, trends and mails.', { required: true }),
  formerly: key(formerIds, 'Earlier ids: the series are carried over.'),
  quantity: key(choice(quantities, 'velocity'), 'What the level is of.', {
    fallback: "the unit's quantity, else the point's",
  }),
  from: key(edge, 'Lower edge: Hz, kHz, rpm, or orders of the running speed (0.5x).', { required: true }),
  to: key(edge, 'Upper edge.', { required: true }),
  unit: key(
    scalar(parseDisplayUnit, { example: 'mm/s' }),
    'How people read it: mm/s, m/s2, g are r.m.s.; in/s, mil, um, mm take rms, peak or pp.',
    {
      fallback: 'm/s², mm/s or µm, r.m.s.',
    },
  ),
};

/** Later kinds of limit each add one word here, their own keys, and one entry where limits are built. */
export const limitKinds = ['fixed'] as const;

export const limitKeys = {
  id: key(id('overall-fixed-upper'), 'Names the limit.', { fallback: 'band-kind-side' }),
  formerly: key(formerIds, 'Earlier ids: standing alarms are carried over.'),
  band: key(id('overall'), 'The band whose level is judged.', { required: true }),
  kind: key(choice(limitKinds), 'fixed: the values as they stand.', { fallback: 'fixed' }),
  side: key(choice(['upper', 'lower']), 'upper: too much; lower: too little.', { fallback: 'upper' }),
  alert: key(levelText, 'The lower severity.'),
  danger: key(levelText, 'The higher severity.'),
  on_delay: key(
    delay,
    'The level must stay over the limit for so many recordings, or so long: single knocks raise nothing.',
    {
      fallback: '2 recordings',
    },
  ),
  off_delay: key(delay, 'The level must stay below for so many recordings, or so long.', {
    fallback: '1 recordings',
  }),
  deadband: key(percent(0, 50, '10 %'), 'The level must fall this far below the limit, in percent of it.', {
    fallback: '10 %',
  }),
  latching: key(trueOrFalse, 'The alarm stands until it is reset by hand.', { fallback: 'false' }),
  say_again_at: key(
    scalar(parseSayAgain, { example: '+25 %' }),
    'An acknowledged alarm is told again when its level has risen by this much; or never.',
    {
      fallback: '+25 %',
    },
  ),
  action: key(
    words(1000, 'Check base bolts and coupling', { lines: true }),
    'What to do first, in the words of the site.',
  ),
  respond_within: key(duration(60_000, 365 * day, '2 d'), 'Time within which a person should have looked.'),
};

const bands = list(map(bandKeys), 200);
const limits = list(map(limitKeys), 400);

export const pointKeys = {
  id: key(id('de-h'), 'Names the point; as written, never as a number.', { required: true }),
  name: key(words(80, 'drive end, horizontal'), 'For people.', { fallback: 'the id' }),
  formerly: key(formerIds, 'Earlier ids: series, baseline and alarms are carried over.'),
  direction: key(words(40, 'horizontal'), 'Direction of measurement.'),
  mounting: key(
    choice(['stud', 'glue', 'magnet', 'hand']),
    'How the sensor is fixed: bounds the usable range.',
  ),
  channel: key(
    scalar(parseChannel, { example: '1', free: true }),
    'Channel of the file: a number from 1, or a column name.',
    { fallback: '1' },
  ),
  quantity: key(choice(quantities), 'What the sensor measures.', { required: true }),
  sensitivity: key(
    scalar(parseSensitivity, { example: '100 mV/g' }),
    'What the sensor gives: 100 mV/g, 10 mV/(m/s2), 4 mV/(mm/s), 8 V/mm.',
  ),
  recordings: key(recordings, 'What differs at this point.'),
  analysis: key(analysis, 'What differs at this point.'),
  bands: key(bands, 'Bands of this point, added to those of its machine; the same id replaces.'),
  limits: key(limits, 'Limits of this point, added to those of its machine; the same id replaces.'),
};

function parseChannel(text: string): Parsed<number | string> {
  const written = text.trim();
  if (/^0+$/.test(written)) return refused('channels count from 1', '1');
  if (/^0\d+$/.test(written))
    return refused(`'${shorten(text)}' is a number with a 0 before it`, written.replace(/^0+/, ''));
  if (/^\d+$/.test(written)) {
    return Number(written) <= 4096
      ? understood(Number(written))
      : refused(`'${shorten(text)}' is above 4096 channels`);
  }
  return understood(written);
}

function parsePower(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['power'], 'kW');
  if (!parsed.ok) return parsed;
  return parsed.value.value > 0
    ? understood(parsed.value.value)
    : refused(`'${shorten(text)}' is not above 0`);
}

/** Which evaluation zones hold for a machine; judged by the zone tables, kept here as chosen. */
export const zoneKeys = {
  standard: key(
    choice(['iso-20816-3', 'iso-10816-7', 'iso-10816-1']),
    'iso-20816-3 with power and support; iso-10816-7 (pumps) with category and power; iso-10816-1 with class.',
    {
      required: true,
    },
  ),
  power: key(scalar(parsePower, { example: '110 kW' }), 'Rated power of the machine.'),
  support: key(
    choice(['rigid', 'flexible']),
    'Rigid: the lowest natural frequency on its support is at least 25 % above the running frequency.',
  ),
  category: key(choice(['I', 'II']), 'iso-10816-7: I high demands on reliability or safety, II general.'),
  class: key(choice(['I', 'II', 'III', 'IV']), 'iso-10816-1, Annex B.'),
};

export const machineTypeKeys = {
  recordings: key(recordings, 'What differs for machines of this type.'),
  analysis: key(analysis, 'What differs for machines of this type.'),
  bands: key(bands, 'Bands of every point of machines of this type.'),
  limits: key(limits, 'Limits of every point of machines of this type.'),
};

export const machineKeys = {
  id: key(id('blower-1'), 'Names the machine; as written, never as a number.', { required: true }),
  name: key(words(80, 'Aeration blower 1'), 'For people.', { fallback: 'the id' }),
  formerly: key(formerIds, 'Earlier ids: series, baselines and alarms are carried over.'),
  area: key(areaName, 'Part of the site.'),
  type: key(id('blower-small'), 'One of machine_types.'),
  running_speed: key(frequency(0.01, 5000, '2970 rpm'), 'Nominal speed of the shaft.'),
  running: key(
    scalar(parseRunning, { example: 'speed above 300 rpm' }),
    "When it counts as running: 'speed above 300 rpm', 'sidecar', 'level of BAND above 0.5 mm/s'.",
    {
      fallback: 'always running',
    },
  ),
  after_start: key(
    duration(0, 7 * day, '10 min'),
    'Recordings within this time after a start are transient: no trend, no baseline.',
    { fallback: '0 s' },
  ),
  stopped_expected: key(duration(60_000, 3650 * day, '7 d'), 'Stopped for longer is told in the summary.', {
    fallback: '7 d',
  }),
  criticality: key(choice(['A', 'B', 'C'], 'B'), 'A matters most; orders the summary.', { fallback: 'B' }),
  like: key(list(id('blower-2'), 50), 'Sister machines, for comparison.'),
  zones: key(map(zoneKeys), 'Evaluation zones of a published standard.'),
  recordings: key(recordings, 'What differs for this machine.'),
  analysis: key(analysis, 'What differs for this machine.'),
  bands: key(
    bands,
    'Bands of every point of this machine, added to those of its type; the same id replaces.',
  ),
  limits: key(
    limits,
    'Limits of every point of this machine, added to those of its type; the same id replaces.',
  ),
  points: key(list(map(pointKeys), 500), 'Measuring points.', { required: true }),
};

export const machines = list(map(machineKeys), 2000);
export const machineTypes = mapById(id('blower-small'), map(machineTypeKeys), 500);
