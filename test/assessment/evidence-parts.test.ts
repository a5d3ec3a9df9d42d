/** The long run (`evidence-parts.long.ts`) proves the figures; here is a part of each of its questions. */
import { describe, expect, it } from 'vitest';
import { faultsOf, machineKinds } from './parts-machine.ts';
import { faultsFound, soundNamed } from './parts-trials.ts';

const seed = 20261201;

describe('evidence of parts on simulated machines', () => {
  it.each(machineKinds)(
    '%s: most faults are found, and none on sound machines',
    { timeout: 120_000 },
    (kind) => {
      const faults: readonly string[] = faultsOf[kind];
      const right = faults.map((fault, n) => faultsFound(kind, fault, 4, seed + 1000 * n));
      for (const count of right) expect(count).toBeGreaterThanOrEqual(3);
      expect(soundNamed(kind, 9, seed + 10_000)).toBe(0);
    },
  );
});
