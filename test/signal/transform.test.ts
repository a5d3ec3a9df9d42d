import { expect, test } from 'vitest';
import { isPowerOfTwo, PairTransform } from '../../src/signal/transform.ts';
import { gaussianNoise, seededRandom } from './random.ts';

function powerByDefinition(samples: Float64Array): Float64Array {
  const length = samples.length;
  return Float64Array.from({ length: length / 2 + 1 }, (_, k) => {
    let real = 0;
    let imaginary = 0;
    for (let n = 0; n < length; n++) {
      real += samples[n] * Math.cos((2 * Math.PI * k * n) / length);
      imaginary -= samples[n] * Math.sin((2 * Math.PI * k * n) / length);
    }
    return real * real + imaginary * imaginary;
  });
}

function pack(transform: PairTransform, first: Float64Array, second: Float64Array): void {
  for (let n = 0; n < transform.length; n++) {
    transform.packed[2 * n] = first[n];
    transform.packed[2 * n + 1] = second[n];
  }
}

function expectClose(measured: Float64Array, expected: Float64Array): void {
  const largest = Math.max(...expected);
  measured.forEach((value, k) => {
    expect(Math.abs(value - expected[k])).toBeLessThanOrEqual(1e-13 * largest);
  });
}

test('worked by hand: the transform of 1 2 3 4 0 0 0 0', () => {
  const transform = new PairTransform(8);
  pack(transform, Float64Array.of(1, 2, 3, 4, 0, 0, 0, 0), new Float64Array(8));
  transform.run();
  const lines = [
    [10, 0],
    [-0.414213562373, -7.242640687119],
    [-2, 2],
    [2.414213562373, -1.242640687119],
    [-2, 0],
  ];
  lines.forEach(([real, imaginary], k) => {
    expect(transform.firstPower[k]).toBeCloseTo(real ** 2 + imaginary ** 2, 9);
    expect(transform.secondPower[k]).toBeCloseTo(0, 12);
  });
});

test.each([2, 4, 8, 16, 32, 64, 128, 256])(
  'both sequences of %i samples come out as by definition',
  (length) => {
    const random = seededRandom(length);
    const transform = new PairTransform(length);
    const first = gaussianNoise(random, length);
    const second = gaussianNoise(random, length, 0.3);
    pack(transform, first, second);
    transform.run();
    expectClose(transform.firstPower, powerByDefinition(first));
    expectClose(transform.secondPower, powerByDefinition(second));
  },
);

test('an impulse has a flat spectrum wherever it stands, and leaves its partner alone', () => {
  const transform = new PairTransform(32);
  const quiet = new Float64Array(32);
  for (let position = 0; position < 32; position++) {
    const impulse = new Float64Array(32);
    impulse[position] = 3;
    pack(transform, quiet, impulse);
    transform.run();
    expectClose(transform.secondPower, new Float64Array(17).fill(9));
    expect(Math.max(...transform.firstPower)).toBeLessThan(1e-28);
  }
});

test('a plan may be run again and again', () => {
  const transform = new PairTransform(64);
  pack(transform, gaussianNoise(seededRandom(1), 64), gaussianNoise(seededRandom(2), 64));
  transform.run();
  const once = [transform.firstPower.slice(), transform.secondPower.slice()];
  transform.run();
  expect([transform.firstPower, transform.secondPower]).toEqual(once);
});

test('two transforms of one length, filled and run in turn, do not disturb each other', () => {
  const signals = [1, 2, 3, 4].map((seed) => gaussianNoise(seededRandom(seed), 64));
  const one = new PairTransform(64);
  const two = new PairTransform(64);
  pack(one, signals[0], signals[1]);
  pack(two, signals[2], signals[3]);
  one.run();
  two.run();
  expectClose(one.firstPower, powerByDefinition(signals[0]));
  expectClose(one.secondPower, powerByDefinition(signals[1]));
  expectClose(two.firstPower, powerByDefinition(signals[2]));
  expectClose(two.secondPower, powerByDefinition(signals[3]));
});

test('a length that is no power of two is refused with its value', () => {
  for (const length of [0, 1, 3, 1000, -8, 8.5, Number.NaN, 2 ** 31]) {
    expect(() => new PairTransform(length)).toThrow(`length = ${length}: a transform needs a power of two`);
  }
  expect([1, 2, 1024, 2 ** 30].every(isPowerOfTwo)).toBe(true);
});
