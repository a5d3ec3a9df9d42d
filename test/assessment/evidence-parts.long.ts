/**
 * The evidence of gears, motors, belts, wheels and couplings on simulated machines (parts-machine.ts says which): of each
 * kind 1,000 sound ones, a third with harmonics of 1x throughout and a third with lines of strangers, and 100 of each fault.
 */
import { describe, expect, it } from 'vitest';
import { faultsOf, machineKinds } from './parts-machine.ts';
import { faultsFound, soundNamed } from './parts-trials.ts';

const seed = 20261201;

describe.each(machineKinds)('evidence of parts on simulated machines: %s', (kind) => {
  it('85 of 100 of each fault are found, and nothing else is named', { timeout: 3_600_000 }, () => {
    const faults: readonly string[] = faultsOf[kind];
    const right = faults.map((fault, n) => faultsFound(kind, fault, 100, seed + 1000 * n));
    console.log(
      `${kind}, rightly named of 100: ${faults.map((fault, n) => `${fault} ${right[n]}`).join(', ')}`,
    );
    for (const count of right) expect(count).toBeGreaterThanOrEqual(85);
  });

  it('at most 20 of 1,000 sound machines are named', { timeout: 3_600_000 }, () => {
    const count = soundNamed(kind, 1000, seed + 10_000);
    console.log(`${kind}, named of 1,000 sound: ${count}`);
    expect(count).toBeLessThanOrEqual(20);
  });
});
