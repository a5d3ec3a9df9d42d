import type { PartKind, PlanetaryMember } from './parts.ts';
import { parseAngle, parseFrequency, parseLength, parseOrder } from './quantity.ts';
import { id } from './schema-values.ts';
import { choice, list, plainNumber, ruled, type Shape, scalar, words } from './shape.ts';
import { key, map } from './shape-map.ts';

/** `parts:` of a machine: what turns, rolls or meshes in it, so that lines of a spectrum can be told by name. */

const kinds = [
  'rolling-bearing',
  'gear-pair',
  'planetary-gear',
  'vanes',
  'blades',
  'belt',
  'electric-motor',
  'coupling',
] as const satisfies readonly PartKind[];

const members = ['sun', 'ring', 'carrier'] as const satisfies readonly PlanetaryMember[];

const size: Shape<number> = scalar(
  ruled(parseLength, (metres) =>
    metres > 0 && metres <= 100 ? null : { what: 'is not above 0 and at most 100 m', instead: null },
  ),
  { example: '38.5 mm', pattern: '^[0-9.]+\\s*(mm|in|mil|um|µm|μm)$' },
);

const angle: Shape<number> = scalar(
  ruled(parseAngle, (degrees) =>
    degrees >= 0 && degrees < 90 ? null : { what: 'is not from 0 to below 90 deg', instead: null },
  ),
  { example: '15 deg', pattern: '^[0-9.]+\\s*(deg|degrees?|°)$' },
);

function order(example: string): Shape<number> {
  const parse = ruled(parseOrder, (turns) =>
    turns > 0 && turns <= 1000 ? null : { what: 'is not above 0x and at most 1000x', instead: null },
  );
  return scalar(parse, { example, pattern: '^[0-9.]+\\s*x$' });
}

const lineFrequency = scalar(
  ruled(
    (text: string) => parseFrequency(text, 'Hz'),
    (hz) => (hz >= 1 && hz <= 1000 ? null : { what: 'is not from 1 to 1000 Hz', instead: null }),
  ),
  { example: '50 Hz', pattern: '^[0-9.]+\\s*(Hz|kHz)$' },
);

const teeth = (example: string) => plainNumber(4, 2000, true, example);

export const partKeys = {
  id: key(id('de-bearing'), 'Names the part; as written, never as a number.', { required: true }),
  kind: key(choice(kinds), 'What it is; decides which keys it takes.', { required: true }),
  name: key(words(80, 'drive-end bearing'), 'For people.', { fallback: 'the id' }),
  at: key(list(id('de-h'), 500), 'Points that hear it.', { fallback: 'every point of the machine' }),
  shaft: key(order('1x'), 'Turns of its shaft for one turn at the running speed.', { fallback: '1x' }),
  rolling_elements: key(
    plainNumber(3, 500, true, '9'),
    'rolling-bearing: number of balls or rollers in a row.',
  ),
  element_diameter: key(size, 'rolling-bearing: diameter of a ball or roller.'),
  pitch_diameter: key(size, 'rolling-bearing: diameter of the circle through the centres of the elements.'),
  contact_angle: key(angle, 'rolling-bearing: angle of contact.', { fallback: '0 deg' }),
  turning_ring: key(choice(['inner', 'outer']), 'rolling-bearing: the ring that turns with the shaft.', {
    fallback: 'inner',
  }),
  ftf: key(order('0.398x'), "rolling-bearing: cage frequency, in the maker's multiple of the shaft."),
  bsf: key(order('2.357x'), 'rolling-bearing: spin of an element (half of what a list of makers may give).'),
  bpfo: key(order('3.585x'), 'rolling-bearing: elements passing a place of the outer race.'),
  bpfi: key(order('5.415x'), 'rolling-bearing: elements passing a place of the inner race.'),
  teeth: key(teeth('23'), 'gear-pair: teeth of the gear on the shaft.'),
  mating_teeth: key(teeth('67'), 'gear-pair: teeth of the gear it meshes with.'),
  sun_teeth: key(teeth('28'), 'planetary-gear: teeth of the sun.'),
  planet_teeth: key(teeth('26'), 'planetary-gear: teeth of a planet.'),
  ring_teeth: key(teeth('80'), 'planetary-gear: teeth of the ring.'),
  planets: key(plainNumber(1, 20, true, '3'), 'planetary-gear: number of planets.'),
  held: key(choice(members, 'ring'), 'planetary-gear: the member that stands still.', { fallback: 'ring' }),
  on_shaft: key(choice(members), 'planetary-gear: the member that turns with the shaft.', {
    fallback: 'sun',
  }),
  count: key(plainNumber(2, 500, true, '7'), 'vanes, blades: how many there are.'),
  pulley_diameter: key(size, 'belt: pitch diameter of the pulley on the shaft.'),
  other_pulley_diameter: key(size, 'belt: pitch diameter of the other pulley.'),
  centre_distance: key(size, 'belt: distance of the two shafts, where the length is not known.'),
  belt_length: key(size, 'belt: length of the belt.'),
  line_frequency: key(lineFrequency, 'electric-motor: frequency that feeds it.'),
  poles: key(
    scalar(
      (text) => {
        const poles = /^\d+$/.test(text.trim()) ? Number(text) : Number.NaN;
        if (poles >= 2 && poles <= 100 && poles % 2 === 0) return { ok: true, value: poles };
        return { ok: false, what: `'${text.trim()}' is not an even number from 2 to 100`, instead: null };
      },
      { example: '4' },
    ),
    'electric-motor: number of poles.',
  ),
  rotor_bars: key(plainNumber(4, 500, true, '44'), 'electric-motor: number of rotor bars.'),
  elements: key(plainNumber(2, 100, true, '6'), 'coupling: jaws, disc packs or bolts around it.'),
};

/** What each kind needs, and what else it takes beside id, kind, name, at and shaft. */
export const keysOfKind: Readonly<
  Record<
    PartKind,
    { readonly needs: readonly (keyof typeof partKeys)[]; readonly takes: readonly (keyof typeof partKeys)[] }
  >
> = {
  'rolling-bearing': {
    needs: [],
    takes: [
      'rolling_elements',
      'element_diameter',
      'pitch_diameter',
      'contact_angle',
      'turning_ring',
      'ftf',
      'bsf',
      'bpfo',
      'bpfi',
    ],
  },
  'gear-pair': { needs: ['teeth', 'mating_teeth'], takes: [] },
  'planetary-gear': {
    needs: ['sun_teeth', 'planet_teeth', 'ring_teeth', 'planets'],
    takes: ['held', 'on_shaft'],
  },
  vanes: { needs: ['count'], takes: [] },
  blades: { needs: ['count'], takes: [] },
  belt: { needs: ['pulley_diameter'], takes: ['belt_length', 'other_pulley_diameter', 'centre_distance'] },
  'electric-motor': { needs: ['line_frequency', 'poles'], takes: ['rotor_bars'] },
  coupling: { needs: [], takes: ['elements'] },
};

export const parts = list(map(partKeys), 200);
