import { windowNames } from '../signal/window.ts';
import { parseFilePattern, parseFilesRegex, parseStartPattern } from './file-pattern.ts';
import { parseSampleUnit, parseSampleValue } from './level.ts';
import { parseDelay, understood } from './quantity.ts';
import { parseDatasetPath } from './sample-layout.ts';
import { envelope } from './schema-envelope.ts';
import { duration, frequency, percent } from './schema-values.ts';
import { choice, list, plainNumber, ruled, type Shape, scalar, words } from './shape.ts';
import { key, map } from './shape-map.ts';
import { parseClock } from './time-zone.ts';

const day = 86_400_000;

const pattern = scalar(parseFilePattern, { example: '<machine>_<any>.wav', free: true });

/** A pattern or a list of them. */
const ignorePatterns: Shape<readonly string[]> = (() => {
  const many = list(pattern, 50);
  return {
    read: (node, name, reading) => {
      const isList = reading.isList(node);
      const one = isList ? null : pattern.read(node, name, reading);
      if (!isList) return one === null ? null : { value: [one.value], at: one.at };
      const read = many.read(node, name, reading);
      return read === null ? null : { value: read.value.map(({ value }) => value), at: read.at };
    },
    jsonSchema: { anyOf: [pattern.jsonSchema, many.jsonSchema] },
    example: "'<any>.tmp'",
  };
})();

/** Names of windows. 'none' and 'boxcar' are what people also call the rectangular one. */
const windowName = choice(windowNames, 'hann');

/** How recordings of a point arrive; machine types, machines and points may override each key. */
export const recordingKeys = {
  files: key(
    pattern,
    'File names, seen from the drop folder: <any> any text, / a subfolder, <machine> and <point> their ids.',
  ),
  files_regex: key(
    scalar(parseFilesRegex, { example: "'^pump_\\d+\\.csv$'", free: true }),
    'Instead of files: a regular expression (RE2 syntax, no look-around) over the whole name.',
  ),
  start_in_name: key(
    scalar(parseStartPattern, { example: '<year><month><day>T<hour><minute><second>Z', free: true }),
    'Where the file name says the start, anywhere in the name.',
  ),
  clock: key(
    scalar(parseClock, { example: 'UTC', pattern: '^(UTC|site|[+-][0-9]{2}:[0-9]{2})$' }),
    "What the logger's clock shows: UTC, site (the site's time zone), or an offset such as +01:00.",
    { fallback: 'UTC' },
  ),
  ignore: key(ignorePatterns, 'Files that are left alone.', { fallback: "['<any>.tmp', '<any>.part']" }),
  sample_rate: key(
    frequency(1, 10_000_000, '25.6 kHz'),
    'Samples a second. Without it the file says, and band edges are not checked against it.',
  ),
  duration: key(duration(1, day, '10 s'), 'Length of one recording.'),
  expected_every: key(duration(1000, 90 * day, '1 h'), 'How often a recording of each point arrives.', {
    fallback: '1 h',
  }),
  overdue_after: key(
    duration(1000, 365 * day, '2 h'),
    'A point is overdue when nothing came for this long.',
    { fallback: 'twice expected_every' },
  ),
  settle: key(duration(0, 3_600_000, '5 s'), 'A file is read once its size has not changed for this long.', {
    fallback: '5 s',
  }),
  sidecar: key(
    choice(['none', 'optional', 'expected'], 'expected'),
    'Whether NAME.json stands beside a recording; expected waits for it.',
    { fallback: 'optional' },
  ),
  samples_in: key(
    scalar(sampleUnitText, { example: 'V' }),
    'What the samples are: V with a sensitivity; m/s2, g, mm/s, um, Pa, A as they stand.',
    { fallback: 'V where the point has a sensitivity' },
  ),
  full_scale: key(
    scalar(parseSampleValue, { example: '10 V' }),
    'Integer samples: the value of the largest one.',
  ),
  dataset: key(
    scalar(parseDatasetPath, { example: '/vibration/acceleration' }),
    'HDF5: path of the data set, or of the group whose data sets are the channels; without it the file must hold one only.',
  ),
  sample_rate_attribute: key(
    words(120, 'sample_rate'),
    'HDF5: the attribute that gives the sample rate in Hz, at the data set or at a group above it.',
  ),
  channels_in: key(
    choice(['columns', 'rows'], 'columns'),
    'NPY and HDF5, two dimensions: whether a channel is a column or a row; said by the shape where one side exceeds 1024.',
  ),
};

/** The unit is judged where the point's quantity is known: for quantity `other` any short text is a unit. */
function sampleUnitText(
  text: string,
): ReturnType<typeof understood<{ text: string; parsed: ReturnType<typeof parseSampleUnit> }>> {
  return understood({ text: text.trim(), parsed: parseSampleUnit(text) });
}

/** Waits of the intake, for the whole site; they stand under `recordings` at the top only. */
export const intakeKeys = {
  incomplete_after: key(
    duration(1000, 7 * day, '10 min'),
    'A file that is still growing or incomplete is set aside after this long.',
    { fallback: '10 min' },
  ),
  unassigned_after: key(
    duration(60_000, 365 * day, '7 d'),
    'A file that no point takes is moved to unassigned after this long.',
    { fallback: '7 d' },
  ),
  clock_tolerance: key(
    duration(0, day, '5 min'),
    'A start this far after the arrival is no clock trouble yet.',
    { fallback: '5 min' },
  ),
  backlog_quiet: key(
    duration(0, 3_600_000, '60 s'),
    'Old files wait until none of their point came for this long, and are then evaluated in order.',
    { fallback: '60 s' },
  ),
  backlog_wait: key(duration(0, day, '15 min'), 'But never longer than this.', { fallback: '15 min' }),
};

/** One recording alone is no pool. */
const poolSize = scalar(
  ruled(parseDelay, (size) =>
    'recordings' in size && size.recordings < 2
      ? { what: 'pools nothing; leave it out, or give at least', instead: '2 recordings' }
      : null,
  ),
  { example: '30 recordings' },
);

export const analysisKeys = {
  window: key(windowName, 'Window of the averaging.', { fallback: 'hann' }),
  overlap: key(percent(0, 95, '50 %'), 'Overlap of the segments.', { fallback: '50 %' }),
  line_spacing: key(
    frequency(0.001, 100_000, '1.6 Hz'),
    'Widest distance between two lines; the segment is the smallest power of two that keeps it.',
    {
      fallback:
        '1.6 Hz; 0.8 Hz below 1200 rpm, 0.4 Hz below 600 rpm; wider where the duration gives no such segment',
    },
  ),
  average_over: key(
    poolSize,
    'Short recordings are pooled: levels come from the average over so many, or over those of so long a time.',
    { fallback: 'each recording by itself' },
  ),
  averaging: key(
    choice(['power', 'median', 'peak-hold']),
    'median: peaks are looked for in the median over the segments (overlap at most 50 %); peak-hold: the spectrum shown is the highest of all segments. Levels come from the power average in any case.',
    { fallback: 'power' },
  ),
  detrend: key(
    choice(['mean', 'linear']),
    'What is taken off each segment: its mean, or its straight line where a signal drifts.',
    { fallback: 'mean' },
  ),
  envelope: key(
    envelope,
    'Spectrum of the demodulated high-frequency band, in which bearing damage shows first.',
    { fallback: 'where a band of the envelope or a rolling bearing asks for it' },
  ),
  skip_start: key(
    duration(0, 600_000, '1 s'),
    'Left out at the start of each recording, while the sensor settles.',
    { fallback: '0 s' },
  ),
  confidence: key(percent(50, 99.9, '95 %'), "Confidence of a level's interval.", { fallback: '95 %' }),
  false_peaks: key(
    plainNumber(0.001, 10, false, '0.1'),
    'Peaks in a spectrum of nothing but noise, on average, that may be reported.',
    { fallback: '0.1' },
  ),
};

export const siteRecordings = map({ ...recordingKeys, ...intakeKeys });
export const recordings = map(recordingKeys);
export const analysis = map(analysisKeys);
export const areaName = words(80, 'aeration');
