import { describe, expect, test } from 'vitest';
import {
  coherentGain,
  highestSideLobeDb,
  leastBandLines,
  mainLobe,
  mainLobeHalfWidthLines,
  makeWindow,
  noiseBandwidthLines,
  scallopingDb,
  type WindowName,
  windowNames,
} from '../../src/signal/window.ts';

/** |DFT of the window at any offset| over its value at 0, summed term by term. */
function lobeByDefinition(window: Float64Array, offset: number): number {
  let real = 0;
  let imaginary = 0;
  let sum = 0;
  for (let n = 0; n < window.length; n++) {
    const angle = (-2 * Math.PI * offset * n) / window.length;
    real += window[n] * Math.cos(angle);
    imaginary += window[n] * Math.sin(angle);
    sum += window[n];
  }
  return Math.hypot(real, imaginary) / sum;
}

describe('coefficients', () => {
  // Worked with numpy and SciPy to twelve digits.
  const firstHalves: [WindowName, number[]][] = [
    ['rectangular', [1, 1, 1, 1, 1]],
    ['hann', [0, 0.146446609407, 0.5, 0.853553390593, 1]],
    ['hamming', [0.08, 0.214730880654, 0.54, 0.865269119346, 1]],
    ['blackman', [0, 0.066446609407, 0.34, 0.773553390593, 1]],
    ['blackman-harris', [0.00006, 0.021735837019, 0.21747, 0.695764162981, 1]],
    ['flat-top', [-0.000421051, -0.026872193286, -0.05473684, 0.444135357286, 1.000000003]],
  ];
  test.each(firstHalves)('%s of eight samples is periodic and mirrored about its middle', (name, half) => {
    const window = makeWindow(name, 8);
    [...half, half[3], half[2], half[1]].forEach((value, n) => {
      expect(window[n]).toBeCloseTo(value, 11);
    });
  });

  test('every window is listed once and has a length that is asked for, odd ones too', () => {
    expect(new Set(windowNames).size).toBe(6);
    for (const name of windowNames) expect(makeWindow(name, 15)).toHaveLength(15);
  });
});

describe('published figures of merit', () => {
  // Printed by Harris 1978, Table I (quoted from memory): coherent gain, noise bandwidth, scalloping loss,
  // highest side lobe. Left out are its figures that recomputation contradicts: Hamming's loss (1.78; it is 1.75).
  const harris: [WindowName, number, number, number | null, number][] = [
    ['rectangular', 1.0, 1.0, 3.92, -13],
    ['hann', 0.5, 1.5, 1.42, -32],
    ['hamming', 0.54, 1.36, null, -43],
    ['blackman', 0.42, 1.73, 1.1, -58],
    ['blackman-harris', 0.36, 2.0, 0.83, -92],
  ];
  test.each(harris)('%s agrees with Harris 1978, Table I', (name, gain, bandwidth, loss, sideLobe) => {
    expect(Math.abs(coherentGain(name) - gain)).toBeLessThan(0.0051);
    expect(Math.abs(noiseBandwidthLines(name) - bandwidth)).toBeLessThan(0.0051);
    if (loss !== null) expect(Math.abs(-scallopingDb(name) - loss)).toBeLessThan(0.0051);
    expect(Math.abs(highestSideLobeDb(name) - sideLobe)).toBeLessThan(0.54);
  });

  // Heinzel, Rüdiger & Schilling 2002, the authors' list of windows: side lobe dB, noise bandwidth, flatness dB.
  const heinzel: [WindowName, number, number, number][] = [
    ['hann', 31.5, 1.5, -1.4236],
    ['hamming', 42.7, 1.3628, -1.7514],
    ['blackman-harris', 92.0, 2.0044, -0.8256],
  ];
  test.each(heinzel)('%s agrees with Heinzel et al. 2002', (name, sideLobe, bandwidth, flatness) => {
    expect(-highestSideLobeDb(name)).toBeCloseTo(sideLobe, 1);
    expect(noiseBandwidthLines(name)).toBeCloseTo(bandwidth, 4);
    expect(scallopingDb(name)).toBeCloseTo(flatness, 4);
  });

  test('closed forms: Hann 20 lg 8/(3 pi), rectangular 20 lg 2/pi; the flat top stays within 0.01 dB', () => {
    expect(scallopingDb('hann')).toBeCloseTo(-1.423623, 6);
    expect(scallopingDb('rectangular')).toBeCloseTo(-3.922398, 6);
    expect(scallopingDb('flat-top')).toBeCloseTo(-0.0098, 4);
    expect(noiseBandwidthLines('flat-top')).toBeCloseTo(3.77025, 5);
  });
});

describe.each(windowNames)('%s against its own samples', (name) => {
  const window = makeWindow(name, 1024);

  test('gain and noise bandwidth are those of the samples', () => {
    const sum = window.reduce((total, w) => total + w, 0);
    const squares = window.reduce((total, w) => total + w * w, 0);
    expect(coherentGain(name)).toBeCloseTo(sum / 1024, 12);
    expect(noiseBandwidthLines(name)).toBeCloseTo((1024 * squares) / sum ** 2, 12);
  });

  test('the lobe at a stated length is that of the samples at any offset', () => {
    for (const length of [16, 33, 256]) {
      const samples = makeWindow(name, length);
      for (let offset = -14; offset <= 14; offset += 0.137) {
        expect(mainLobe(name, offset, length)).toBeCloseTo(lobeByDefinition(samples, offset), 12);
      }
    }
  });

  test('the lobe of an endless window is the limit of long ones', () => {
    for (let offset = 0; offset <= 6; offset += 0.1) {
      expect(mainLobe(name, offset)).toBeCloseTo(lobeByDefinition(window, offset), 3);
    }
    expect(mainLobe(name, 0)).toBeCloseTo(1, 14);
    expect(mainLobe(name, 1e-12)).toBeCloseTo(1, 12);
  });

  test('the main lobe ends at its half width and the highest side lobe is as stated', () => {
    const end = mainLobeHalfWidthLines(name);
    expect(mainLobe(name, end)).toBeLessThan(1e-8);
    expect(mainLobe(name, end - 0.1)).toBeGreaterThan(1e-6);
    let highest = 0;
    for (let offset = end; offset < 60; offset += 0.001) highest = Math.max(highest, mainLobe(name, offset));
    expect(Math.abs(20 * Math.log10(highest) - highestSideLobeDb(name))).toBeLessThan(0.01);
  });

  test('a band needs one line more than half the main lobe, and never fewer than three', () => {
    expect(leastBandLines(name)).toBe(Math.max(3, mainLobeHalfWidthLines(name) + 1));
  });
});
