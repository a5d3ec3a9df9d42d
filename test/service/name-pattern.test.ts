import { expect, it } from 'vitest';
import { namePattern } from '../../src/service/set-aside.ts';

it.each([
  ['digits', 'well/P3_20261201.wav', 'well/P17_20261202.wav'],
  ['UUIDs', 'a/1f0c3a52-9b7e-4d1a-8c55-0e6f2b7d9a10.wav', 'a/C0FFEE00-aaaa-bbbb-cccc-deadbeefcafe.wav'],
  ['hex numbers', 'rec_9f86d081884c7d65.wav', 'rec_1a2b3c4dffffffffff.wav'],
])('names that differ in %s only are of one kind', (_what, one, other) => {
  expect(namePattern(one)).toBe(namePattern(other));
});

it.each([
  ['words of hex letters alone', 'facade-deadbeef.wav', 'facade-cafebabe.wav'],
  ['short names', 'ab1c.wav', 'cd1e.wav'],
  ['words around digits', 'station12a.wav', 'statios12b.wav'],
])('%s keep names apart', (_what, one, other) => {
  expect(namePattern(one)).not.toBe(namePattern(other));
});
