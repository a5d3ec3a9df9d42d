import { describe, expect, it } from 'vitest';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

/** The example with other parts in place of its own. */
const withParts = (...parts: string[]) =>
  exampleWith([
    `      - id: impeller
        kind: blades
        count: 11
`,
    `${parts.join('\n')}\n`,
  ]);
const part = (...lines: string[]) => ['      - id: p', ...lines.map((line) => `        ${line}`)].join('\n');
/** Parts of the machine that has them, after the bearing of the example. */
const partsOf = (text: string) =>
  siteOf(text)
    .machines.find(({ id }) => id === 'blower-2')
    ?.parts?.slice(1);
const told = (...lines: string[]) =>
  complaints(withParts(part(...lines))).map((line) => line.replace(/^(site\.yaml):\d+:\d+: /, ''));

describe('parts of a machine', () => {
  it('are read in metres, degrees and turns of the running speed, and are heard by every point unless it is said', () => {
    const [bearing, impeller] =
      siteOf(exampleWith()).machines.find(({ id }) => id === 'blower-2')?.parts ?? [];
    expect(bearing).toEqual({
      kind: 'rolling-bearing',
      id: 'de-bearing',
      name: 'drive-end bearing',
      at: ['de-h'],
      shaft: 1,
      geometry: { rollingElements: 9, elementDiameter: 0.00794, pitchDiameter: 0.0385, contactAngleDeg: 0 },
      multiples: { ftf: null, bsf: null, bpfo: null, bpfi: null },
      turningRing: 'inner',
    });
    expect(impeller).toMatchObject({ kind: 'blades', name: 'impeller', count: 11, at: ['de-h'] });
  });

  it('of every kind', () => {
    const text = withParts(
      part('kind: rolling-bearing', 'shaft: 0.3433x', 'bpfo: 3.585x', 'turning_ring: outer').replace(
        'p',
        'a',
      ),
      part('kind: gear-pair', 'teeth: 23', 'mating_teeth: 67').replace('p', 'b'),
      part(
        'kind: planetary-gear',
        'sun_teeth: 28',
        'planet_teeth: 26',
        'ring_teeth: 80',
        'planets: 3',
      ).replace('p', 'c'),
      part('kind: belt', 'pulley_diameter: 8 in', 'belt_length: 2000 mm').replace('p', 'd'),
      part('kind: electric-motor', 'line_frequency: 50 Hz', 'poles: 4', 'rotor_bars: 44').replace('p', 'e'),
      part('kind: coupling', 'elements: 6').replace('p', 'f'),
      part('kind: vanes', 'count: 7').replace('p', 'g'),
    );
    expect(partsOf(text)).toMatchObject([
      { kind: 'rolling-bearing', shaft: 0.3433, geometry: null, multiples: { bpfo: 3.585, ftf: null } },
      { kind: 'gear-pair', teeth: 23, matingTeeth: 67 },
      { kind: 'planetary-gear', sunTeeth: 28, held: 'ring', onShaft: 'sun' },
      { kind: 'belt', pulleyDiameter: 0.2032, length: 2, otherPulleyDiameter: null },
      { kind: 'electric-motor', lineHz: 50, poles: 4, rotorBars: 44 },
      { kind: 'coupling', elements: 6 },
      { kind: 'vanes', count: 7 },
    ]);
  });

  it('a belt on two pulleys has the length that their distance gives', () => {
    const lines = ['pulley_diameter: 200 mm', 'other_pulley_diameter: 400 mm', 'centre_distance: 600 mm'];
    const [belt] = partsOf(withParts(part('kind: belt', ...lines))) ?? [];
    // 2 x 600 + 300 pi + 200²/(4 x 600) mm, by hand.
    expect(belt).toMatchObject({ length: expect.closeTo(2.15914, 4) });
  });
});

describe('what is wrong with a part is told with what would be right', () => {
  it.each([
    [
      'a unit, and not a level',
      ['kind: belt', 'pulley_diameter: 200', 'belt_length: 2000 mm'],
      "pulley_diameter: '200' has no unit; write: pulley_diameter: 200 mm",
    ],
    [
      'a kind that is not known',
      ['kind: rolling-bearings'],
      "kind: 'rolling-bearings' is none of rolling-bearing, gear-pair, planetary-gear, vanes, blades, belt, electric-motor, coupling; write: kind: rolling-bearing",
    ],
    [
      'a key of another kind',
      ['kind: vanes', 'count: 7', 'teeth: 23'],
      'teeth has no meaning in a part of the kind vanes; it takes count',
    ],
    [
      'what a kind needs',
      ['kind: gear-pair', 'teeth: 23'],
      'a part of the kind gear-pair needs mating_teeth; add: mating_teeth: 67',
    ],
    [
      'a bearing without sizes and multiples',
      ['kind: rolling-bearing'],
      "a rolling-bearing needs its geometry or its multiples; add rolling_elements, element_diameter, pitch_diameter and contact_angle, or the maker's multiples such as bpfo: 3.585x",
    ],
    [
      'a size left out',
      ['kind: rolling-bearing', 'rolling_elements: 9', 'element_diameter: 7.94 mm'],
      'a part of the kind rolling-bearing with a geometry needs pitch_diameter; add: pitch_diameter: 38.5 mm',
    ],
    [
      'more elements than fit',
      [
        'kind: rolling-bearing',
        'rolling_elements: 16',
        'element_diameter: 7.94 mm',
        'pitch_diameter: 38.5 mm',
      ],
      '16 elements of this diameter do not fit on this pitch circle, 15 do; count the elements of one row, and measure in one unit',
    ],
    [
      'inches among millimetres',
      [
        'kind: rolling-bearing',
        'rolling_elements: 9',
        'element_diameter: 7.94 in',
        'pitch_diameter: 38.5 mm',
      ],
      'the element is as large as the circle that it runs on; give the diameter of a ball or roller, and of the circle through their centres',
    ],
    [
      'teeth that do not close',
      ['kind: planetary-gear', 'sun_teeth: 28', 'planet_teeth: 36', 'ring_teeth: 80', 'planets: 3'],
      'a ring of 80 teeth does not close around a sun of 28 and planets of 36; ring = sun + twice planet, 100 here',
    ],
    [
      'an odd number of poles',
      ['kind: electric-motor', 'line_frequency: 50 Hz', 'poles: 3'],
      "poles: '3' is not an even number from 2 to 100; write for example: poles: 4",
    ],
    [
      'a point that there is not',
      ['kind: vanes', 'count: 7', 'at: [de-v]'],
      "blower-2 has no point 'de-v'; write: at: [de-h]",
    ],
    [
      'a multiple without its x',
      ['kind: rolling-bearing', 'bpfo: 3.585'],
      "bpfo: '3.585' has no unit; write: bpfo: 3.585 x",
    ],
  ])('%s', (_name, lines, complaint) => {
    expect(told(...lines)).toEqual([complaint]);
  });

  it('an id twice', () => {
    const text = withParts(part('kind: vanes', 'count: 7'), part('kind: vanes', 'count: 5'));
    expect(complaints(text)).toEqual([expect.stringContaining("part id 'p' stands twice in blower-2")]);
  });
});
