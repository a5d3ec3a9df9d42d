import { expect, it } from 'vitest';
import { ambiguousMachines, countAccepted, countFound } from './speed-trials.ts';

it('finds the speed of 95 % of 2,000 simulated machines to 0.1 %', () => {
  const { counts, missed } = countFound(2000);
  console.log('speed from the spectrum', counts);
  expect(counts.right, missed.join('\n')).toBeGreaterThanOrEqual(1900);
  expect(counts.wrong, missed.join('\n')).toBeLessThanOrEqual(20);
  expect(counts.inside).toBeGreaterThanOrEqual(0.95 * (counts.right + counts.wrong));
}, 600_000);

it.each(Object.keys(ambiguousMachines))(
  'refuses 98 of 100: %s',
  (name) => {
    const accepted = countAccepted(name, 100);
    console.log(name, 'accepted', accepted.length);
    expect(accepted.length, accepted.join('\n')).toBeLessThanOrEqual(2);
  },
  300_000,
);
