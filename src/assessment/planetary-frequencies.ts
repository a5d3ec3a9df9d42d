import type { PlanetaryGear, PlanetaryMember } from '../config/parts.ts';
import type { CharacteristicFrequency } from './fault-frequencies.ts';

/**
 * Speeds of sun, ring and carrier in turns of the running speed (Willis 1841): seen from the carrier the gears turn as
 * in a fixed train, (sun - carrier) / (ring - carrier) = -ring teeth / sun teeth. One is held, one is on the shaft.
 */
export function planetarySpeeds(gear: PlanetaryGear): Readonly<Record<PlanetaryMember, number>> {
  const { sunTeeth: s, ringTeeth: r, held, onShaft, shaft } = gear;
  // s sun + r ring - (s + r) carrier = 0
  const weights: Readonly<Record<PlanetaryMember, number>> = { sun: s, ring: r, carrier: -(s + r) };
  const third = (['sun', 'ring', 'carrier'] as const).find((one) => one !== held && one !== onShaft) ?? held;
  const speeds = { sun: 0, ring: 0, carrier: 0 };
  speeds[onShaft] = shaft;
  speeds[third] = -(weights[onShaft] * shaft) / weights[third];
  return speeds;
}

/**
 * Mesh of a planetary set, ring teeth x |ring - carrier| = sun teeth x |sun - carrier|, and how often a defect of each
 * member is struck: of the sun and of the ring by each planet, of a planet by sun and ring in one turn.
 */
export function planetaryFrequencies(gear: PlanetaryGear): CharacteristicFrequency[] {
  const { sun, ring, carrier } = planetarySpeeds(gear);
  const { sunTeeth, planetTeeth, planets, onShaft, held } = gear;
  const pastSun = Math.abs(sun - carrier);
  const pastRing = Math.abs(ring - carrier);
  const spin = (sunTeeth / planetTeeth) * pastSun;
  const locked = (kind: CharacteristicFrequency['kind'], of: string, perTurn: number) => ({
    kind,
    of,
    perTurn,
    fixedHz: 0,
    slips: false,
  });
  const speeds = { sun, ring, carrier };
  const others = (['sun', 'ring', 'carrier'] as const).filter((one) => one !== onShaft && one !== held);
  return [
    locked('gear mesh', 'the mesh', sunTeeth * pastSun),
    ...others.map((one) => locked('shaft', `the ${one}`, Math.abs(speeds[one]))),
    locked('planet pass', 'a planet at each place of the ring', planets * pastRing),
    locked('sun defect', 'a tooth of the sun', planets * pastSun),
    locked('planet defect', 'a tooth of a planet', 2 * spin),
  ];
}
