import type { GearPair, PlanetaryGear } from '../config/parts.ts';
import { characteristicFrequencies } from './fault-frequencies.ts';
import { harmonicName } from './line-names.ts';
import { ordinaryLines } from './ordinary-lines.ts';
import { sidebandWords } from './part-words.ts';
import { planetarySpeeds } from './planetary-frequencies.ts';
import { type Carrier, lineAt, mainLobesApartLines, sidebandPicture } from './sidebands.ts';
import type { Looked, Sought } from './sought.ts';
import { separationLines, toleranceLines } from './standing-lines.ts';

/**
 * A sound gear shows its mesh, its harmonics and a weak first pair of sidebands; what is looked for is more orders of
 * sidebands at a shaft's spacing, or a first pair of some size: wear, run-out and misalignment make the near ones strong,
 * a damaged tooth makes many (Randall, J. Mech. Des. 104(2), 1982, 259-267; common practice). Where 'some size' begins
 * no standard says: a quarter of the mesh line, and 3 % of it for further orders.
 */
const firstPart = 0.25;
const leastPart = 0.03;
const meshHarmonics = 3;
const mostOrders = 5;

export interface Spacing {
  readonly fault: string;
  readonly hz: number;
  /** '1x', 'mating shaft 1x': of `times` of it. */
  readonly name: (times: number) => string;
  readonly suggests: string;
}

export interface Mesh {
  readonly hz: number;
  readonly spacings: readonly Spacing[];
  /** What passes a place of the ring beside the mesh of a sound planetary set, Hz; null: none. */
  readonly passHz: number | null;
}

export function gearsSought(looked: Looked, part: GearPair | PlanetaryGear): Sought[] {
  const mesh = meshOf(part, looked.speed.hz);
  const { lineSpacingHz } = looked.spectrum;
  const ordinary = ordinaryLines(looked.partsOfMachine, part, looked.speed);
  return mesh.spacings
    .filter(({ hz }) => hz >= mainLobesApartLines * lineSpacingHz)
    .flatMap((spacing) => soughtBeside(looked, { part, mesh, spacing, ordinary }) ?? []);
}

interface Beside {
  readonly part: GearPair | PlanetaryGear;
  readonly mesh: Mesh;
  readonly spacing: Spacing;
  readonly ordinary: readonly number[];
}

function soughtBeside(looked: Looked, { part, mesh, spacing, ordinary }: Beside): Sought | null {
  const { spectrum, speed } = looked;
  const near = separationLines * spectrum.lineSpacingHz;
  const carriers = carriersOf(looked, mesh, spacing.hz);
  const others = mesh.spacings.filter(({ hz }) => hz > spacing.hz);
  const counts = (hz: number) => {
    if (ordinary.some((one) => Math.abs(one - hz) < near)) return false;
    return carriers.every((carrier) => {
      const beside = Math.abs(hz - carrier.hz);
      if (beside > mesh.hz / 2) return true;
      if (isMultiple(beside, mesh.passHz, near)) return false;
      return others.every((other) => !isMultiple(beside, other.hz, near));
    });
  };
  const picture = sidebandPicture({
    carriers,
    betweenHz: mesh.hz,
    stepHz: spacing.hz,
    windowHz: (spacing.hz * speed.uncertaintyHz) / speed.hz,
    ...{ mostOrders, firstPart, leastPart, counts },
  });
  if (picture === null) return null;
  const alike = mesh.spacings.filter(
    (other) => other !== spacing && Math.abs(other.hz - spacing.hz) < near && other.hz < spacing.hz,
  );
  return {
    part,
    fault: spacing.fault,
    frequency: 'gear mesh',
    isObservation: false,
    picture,
    expectedHz: mesh.hz,
    observedHz: ({ lines }) => {
      const [first] = carriers.filter(({ hz }) => lines.some(({ place }) => place.besideHz === hz));
      return first === undefined ? mesh.hz : first.hz / first.harmonic;
    },
    words: (shown) =>
      sidebandWords(shown, carriers, {
        at: spacing.name(1),
        around: 'the mesh',
        part: part.name,
        suggests: [
          spacing.suggests,
          ...alike.map((other) => `or ${other.fault}, which these lines cannot tell from it`),
        ],
      }),
    nameOf: ({ besideHz, times }) => {
      const harmonic = carriers.find(({ hz }) => hz === besideHz)?.harmonic ?? 1;
      return `${harmonicName('gear mesh', harmonic)} ${times < 0 ? '-' : '+'} ${spacing.name(Math.abs(times))}`;
    },
  };
}

function isMultiple(hz: number, ofHz: number | null, withinHz: number): boolean {
  if (ofHz === null) return false;
  const times = Math.round(hz / ofHz);
  return times >= 1 && times <= mostOrders && Math.abs(hz - times * ofHz) < withinHz;
}

/**
 * Harmonics of the mesh that sidebands could be told to belong to. In a planetary set the mesh itself may be missing, the
 * planets' passing stands beside it instead (McFadden & Smith, Proc. IMechE 199(C1), 1985, 65-70).
 */
function carriersOf({ spectrum, speed }: Looked, mesh: Mesh, stepHz: number): Carrier[] {
  const carriers: Carrier[] = [];
  const toleranceHz = toleranceLines * spectrum.lineSpacingHz;
  for (let harmonic = 1; harmonic <= meshHarmonics; harmonic++) {
    const expected = harmonic * mesh.hz;
    const uncertaintyHz = (expected * speed.uncertaintyHz) / speed.hz;
    if (expected > spectrum.toHz || uncertaintyHz + toleranceHz > stepHz / 2) continue;
    const line = lineAt(spectrum, expected, uncertaintyHz);
    const passing = [-4, -3, -2, -1, 1, 2, 3, 4].flatMap((times) => {
      const at =
        mesh.passHz === null ? null : lineAt(spectrum, expected + times * mesh.passHz, uncertaintyHz);
      return at === null ? [] : [at.level];
    });
    if (line === null && (passing.length === 0 || uncertaintyHz > toleranceHz)) continue;
    const level = Math.max(line?.level ?? 0, ...passing);
    carriers.push({ hz: line?.frequencyHz ?? expected, level, harmonic });
  }
  return carriers;
}

export function meshOf(part: GearPair | PlanetaryGear, runningHz: number): Mesh {
  return part.kind === 'gear-pair' ? meshOfPair(part, runningHz) : meshOfSet(part, runningHz);
}

function meshOfPair(part: GearPair, runningHz: number): Mesh {
  const { teeth, matingTeeth, shaft } = part;
  const ownHz = shaft * runningHz;
  const matingHz = (teeth * ownHz) / matingTeeth;
  const hunting = characteristicFrequencies(part).find(({ kind }) => kind === 'hunting tooth')?.perTurn ?? 0;
  const own = (times: number) => `${Number((times * shaft).toPrecision(4))}x`;
  const spacings: Spacing[] = [
    {
      fault: 'gear on the shaft',
      hz: ownHz,
      name: own,
      suggests: `the gear at ${own(1)}: wear, run-out or a tooth`,
    },
    {
      fault: 'mating gear',
      hz: matingHz,
      name: (times) => `mating shaft ${times}x`,
      suggests: 'the mating gear: wear, run-out or a tooth',
    },
  ];
  // Where every tooth meets the same ones each turn, hunting is a shaft.
  const hz = hunting * runningHz;
  if (hz < 0.99 * Math.min(ownHz, matingHz)) {
    const suggests = 'the same two teeth meeting, a mark on one of each gear';
    spacings.push({
      fault: 'two teeth that meet',
      hz,
      name: (times) => harmonicName('hunting tooth', times),
      suggests,
    });
  }
  return { hz: teeth * ownHz, spacings, passHz: null };
}

function meshOfSet(part: PlanetaryGear, runningHz: number): Mesh {
  const speeds = planetarySpeeds(part);
  const turning = (['sun', 'carrier', 'ring'] as const).filter((one) => one !== part.held);
  const perTurn = (kind: string) =>
    characteristicFrequencies(part).find((one) => one.kind === kind)?.perTurn ?? 0;
  return {
    hz: perTurn('gear mesh') * runningHz,
    passHz: perTurn('planet pass') * runningHz,
    spacings: [
      ...turning.map((member) => ({
        fault: member,
        hz: Math.abs(speeds[member]) * runningHz,
        name: (times: number) => `${member} ${times}x`,
        suggests:
          member === 'carrier'
            ? 'the carrier, or planets that bear unequally'
            : `the ${member}: wear or run-out`,
      })),
      ...(['sun', 'planet'] as const).map((member) => ({
        fault: `tooth of ${member === 'sun' ? 'the sun' : 'a planet'}`,
        hz: perTurn(`${member} defect`) * runningHz,
        name: (times: number) => harmonicName(`${member} defect`, times),
        suggests: `a tooth of ${member === 'sun' ? 'the sun' : 'a planet'}`,
      })),
    ].sort((a, b) => a.hz - b.hz),
  };
}
