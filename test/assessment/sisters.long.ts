/** How often machines of whom nothing is the matter are named beside their sisters, and how many whose level grew. */
import { expect, it } from 'vitest';
import { shareNamed } from './sisters-figures.ts';

const courses: Record<string, (day: number) => number> = {
  'twice for five days': (day) => (day < 25 ? 0 : Math.LN2),
  'three times for five days': (day) => (day < 25 ? 0 : Math.log(3)),
  'twice in the last ten days': (day) => Math.max(0, day - 20) * (Math.LN2 / 10),
  'twice in thirty days': (day) => (day * Math.LN2) / 30,
};
const leastNamed: Record<number, readonly number[]> = {
  1: [0.5, 0.95, 0.25, 0.3],
  2: [0.85, 0.97, 0.65, 0.5],
  3: [0.85, 0.97, 0.7, 0.5],
};

for (const sisters of [1, 2, 3]) {
  it(`beside ${sisters}: fewer than two of 2,400 bands named for nothing`, { timeout: 300_000 }, () => {
    const groups = 1000;
    const named = 2400 * shareNamed(groups, sisters, () => 0);
    const found = Object.values(courses).map((course) => shareNamed(50, sisters, course));
    console.info(
      `beside ${sisters}: ${named.toFixed(2)} of 2,400 bands named for nothing (${groups * 12} tried); ` +
        Object.keys(courses)
          .map((name, n) => `${name} ${(100 * (found[n] ?? 0)).toFixed(0)} %`)
          .join(', '),
    );
    expect(named).toBeLessThan(2);
    for (const [n, least] of (leastNamed[sisters] ?? []).entries())
      expect(found[n]).toBeGreaterThanOrEqual(least);
  });
}
