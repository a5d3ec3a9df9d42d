import { parseDisplayUnit } from './level.ts';
import { bandsOrOctaves } from './octave-entries.ts';
import { parseEdge } from './quantity.ts';
import { formerIds, id } from './schema-values.ts';
import { choice, list, ruled, type Shape, scalar, type Written } from './shape.ts';
import { key, map, type ReadMap } from './shape-map.ts';
import type { Quantity } from './site.ts';

export const quantities = [
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

export const bandKeys = {
  id: key(id('overall'), 'Names the band in limits, trends and mails.', { required: true }),
  formerly: key(formerIds, 'Earlier ids: the series are carried over.'),
  of: key(choice(['spectrum', 'envelope'], 'envelope'), 'envelope: a band of the envelope spectrum.', {
    fallback: 'spectrum',
  }),
  quantity: key(choice(quantities, 'velocity'), 'What the level is of.', {
    fallback: "the unit's quantity, else the point's",
  }),
  from: key(edge, 'Lower edge: Hz, kHz, rpm, or orders of the running speed (0.5x).', { required: true }),
  to: key(edge, 'Upper edge.', { required: true }),
  unit: key(
    scalar(parseDisplayUnit, { example: 'mm/s' }),
    'How people read it: mm/s, m/s2, g are r.m.s.; in/s, mil, um, mm take rms, peak or pp; dB is re the reference of ISO 1683.',
    {
      fallback: 'm/s², mm/s or µm, r.m.s.',
    },
  ),
};

/** In place of a band: the octave or third-octave bands of a range, each a band of its own. */
export const octaveKeys = {
  octaves: key(
    choice(['1/3', '1/1']),
    'The bands of IEC 61260-1 (base ten) from the nominal mid-band `from` to the nominal mid-band `to`: third-31.5Hz, octave-1000Hz, ...',
    { required: true },
  ),
  id: key(id('v'), 'Stands before the ids of the bands: v-third-31.5Hz.', { fallback: 'nothing' }),
  of: bandKeys.of,
  quantity: bandKeys.quantity,
  from: key(edge, 'Lowest nominal mid-band: 25 Hz.', { required: true }),
  to: key(edge, 'Highest nominal mid-band: 10 kHz.', { required: true }),
  unit: bandKeys.unit,
};

const entries = list(bandsOrOctaves(map(bandKeys), map(octaveKeys)), 200);

/** A list of bands, with octave entries written out. */
export const bands: Shape<readonly Written<ReadMap<typeof bandKeys>>[]> = {
  ...entries,
  read: (node, name, reading) => {
    const read = entries.read(node, name, reading);
    return read === null ? null : { value: read.value.flatMap(({ value }) => value), at: read.at };
  },
};
