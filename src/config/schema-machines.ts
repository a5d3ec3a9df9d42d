import { conditions } from './operating-conditions.ts';
import { parseRunning } from './running-rule.ts';
import { bands, quantities } from './schema-bands.ts';
import { limits } from './schema-limits.ts';
import { parts } from './schema-parts.ts';
import { analysis, areaName, recordings } from './schema-recordings.ts';
import { speedKeys } from './schema-speed.ts';
import { channel, duration, formerIds, frequency, id } from './schema-values.ts';
import { sensorPlaces, zoneKeys } from './schema-zones.ts';
import { parseSensitivity } from './sensitivity.ts';
import { choice, list, scalar, words } from './shape.ts';
import { key, map, mapById } from './shape-map.ts';
import { suppressedWhileKey } from './suppressed-while.ts';

const day = 86_400_000;

export const pointKeys = {
  id: key(id('de-h'), 'Names the point; as written, never as a number.', { required: true }),
  name: key(words(80, 'drive end, horizontal'), 'For people.', { fallback: 'the id' }),
  formerly: key(formerIds, 'Earlier ids: series, baseline and alarms are carried over.'),
  direction: key(words(40, 'horizontal'), 'Direction of measurement.'),
  mounting: key(
    choice(['stud', 'glue', 'magnet', 'hand']),
    'How the sensor is fixed: bounds the usable range.',
  ),
  sensor_on: key(choice(sensorPlaces), 'Where the sensor sits; evaluation zones hold for bearing housings.', {
    fallback: 'bearing-housing; shaft where displacement is measured',
  }),
  channel: key(channel, 'Channel of the file: a number from 1, or a column name.', { fallback: '1' }),
  quantity: key(choice(quantities), 'What the sensor measures.', { required: true }),
  sensitivity: key(
    scalar(parseSensitivity, { example: '100 mV/g' }),
    'What the sensor gives: 100 mV/g, 10 mV/(m/s2), 4 mV/(mm/s), 8 V/mm.',
  ),
  recordings: key(recordings, 'What differs at this point.'),
  analysis: key(analysis, 'What differs at this point.'),
  bands: key(bands, 'Bands of this point, added to those of its machine; the same id replaces.'),
  limits: key(limits, 'Limits of this point, added to those of its machine; the same id replaces.'),
  suppressed_while: suppressedWhileKey,
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
  speed: key(map(speedKeys), 'How the running speed of each recording is found, where no sidecar says it.'),
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
  conditions: key(
    conditions,
    'Operating conditions: levels are compared within one; the first that fits a recording holds.',
    { fallback: 'all running is one condition' },
  ),
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
  suppressed_while: suppressedWhileKey,
  points: key(list(map(pointKeys), 500), 'Measuring points.', { required: true }),
  parts: key(parts, 'What turns, rolls or meshes in it: gives lines of a spectrum their names.'),
};

export const machines = list(map(machineKeys), 2000);
export const machineTypes = mapById(id('blower-small'), map(machineTypeKeys), 500);
