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
    // What a wrong number names is the wrong bearing.
    [
      'races that are mixed up',
      ['kind: rolling-bearing', 'bpfo: 5.415x', 'bpfi: 3.585x'],
      'bpfo of 5.415x is not below bpfi of 3.585x, and an outer race is passed less often; write: bpfo: 3.585x and bpfi: 5.415x',
    ],
    [
      'races of two bearings',
      ['kind: rolling-bearing', 'bpfo: 3.585x', 'bpfi: 4.947x'],
      "bpfo and bpfi add up to 8.53x, which is no number of elements; compare both with the maker's list",
    ],
    [
      'the strikes of an element for its spin',
      ['kind: rolling-bearing', 'bpfo: 3.5848x', 'bpfi: 5.4152x', 'ftf: 0.3983x', 'bsf: 4.7135x'],
      'bsf of 4.713x is twice what an element of this bearing spins; write: bsf: 2.35675x',
    ],
    [
      'a cage that outruns its shaft',
      ['kind: rolling-bearing', 'ftf: 0.602x', 'bpfo: 3.585x'],
      'ftf of 0.602x is that of a bearing whose outer ring turns; add turning_ring: outer, or write: ftf: 0.398x',
    ],
    [
      'a multiple that its own sizes contradict',
      [
        'kind: rolling-bearing',
        'rolling_elements: 9',
        'element_diameter: 7.94 mm',
        'pitch_diameter: 38.5 mm',
        'bpfo: 5.428x',
      ],
      'bpfo of 5.428x is not what the sizes give, 3.572x; leave bpfo out, or the sizes',
    ],
  ])('%s', (_name, lines, complaint) => {
    expect(told(...lines)).toEqual([complaint]);
  });

  // Drive and fan end of the CWRU test rig, XJTU-SY, IMS; with the outer ring turning; with angles of contact of up to 40 degrees.
  it.each([
    ['ftf: 0.39828x', 'bsf: 2.35672x', 'bpfo: 3.5848x', 'bpfi: 5.4152x'],
    ['ftf: 0.3817x', 'bsf: 1.9937x', 'bpfo: 3.0530x', 'bpfi: 4.9469x'],
    ['ftf: 0.44325x', 'bsf: 4.1975x', 'bpfo: 7.0921x', 'bpfi: 8.9079x'],
    ['turning_ring: outer', 'ftf: 0.60169x', 'bpfo: 3.5848x', 'bpfi: 5.4152x'],
    ['ftf: 0.404x', 'bsf: 1.93x', 'bpfo: 5.25x', 'bpfi: 7.75x'],
  ])("a maker's multiples are taken: %s %s", (...lines) => {
    expect(told('kind: rolling-bearing', ...lines)).toEqual([]);
  });

  it('an id twice', () => {
    const text = withParts(part('kind: vanes', 'count: 7'), part('kind: vanes', 'count: 5'));
    expect(complaints(text)).toEqual([expect.stringContaining("part id 'p' stands twice in blower-2")]);
  });
});
