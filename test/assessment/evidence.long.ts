/** The evidence of bearing faults on simulated machines: what is found, what is left, and what is never said. */
import { describe, expect, it } from 'vitest';
import { seededRandom } from '../signal/random.ts';
import { bearingMachine, bearingNearHarmonic } from './bearing-machine.ts';
import { named, namedByDeclaredSpeed, rightlyNamed, simulatedFaults } from './evidence-trials.ts';

const seed = 20261201;

describe('evidence on simulated machines (speed wrong by 0.5 %, slip to 1 %, 10 to 50 Hz, impacts from -12 dB on)', () => {
  it('names 90 of 100 faults rightly, and 85 of 100 of each kind', { timeout: 1_800_000 }, () => {
    const right = simulatedFaults.map((fault, kind) => rightlyNamed({ fault }, 100, seed + 1000 * kind));
    console.log(
      `rightly named of 100 each: ${simulatedFaults.map((fault, n) => `${fault} ${right[n]}`).join(', ')}`,
    );
    expect(right[0] + right[1] + right[2]).toBeGreaterThanOrEqual(270);
    for (const count of right) expect(count).toBeGreaterThanOrEqual(85);
  });

  it('names a fault on at most 20 of 1,000 healthy machines', { timeout: 1_800_000 }, () => {
    const count = named((n) => ({ fault: null, oncePerTurn: n % 3 === 0 }), 1000, seed + 10_000);
    console.log(`named of 1,000 healthy: ${count}`);
    expect(count).toBeLessThanOrEqual(20);
  });

  it('names none on healthy machines whose shaft harmonics lie within 2 % of a fault frequency', {
    timeout: 1_800_000,
  }, () => {
    const kindOf = (n: number) => ({
      fault: null,
      oncePerTurn: true,
      bearing: bearingNearHarmonic(seededRandom(seed + n)),
    });
    expect(named(kindOf, 200, seed + 20_000)).toBe(0);
    const machines = Array.from({ length: 20 }, (_, n) =>
      bearingMachine(seededRandom(seed + 20_000 + n), kindOf(n)),
    );
    // A window of 2 % around the frequency by declared speed takes the shaft's line for the bearing's.
    expect(machines.filter(namedByDeclaredSpeed).length).toBeGreaterThanOrEqual(18);
  });
});
