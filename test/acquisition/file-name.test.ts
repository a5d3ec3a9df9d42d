import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  fitName,
  longestFiledNameBytes,
  madeUpName,
  nameProblem,
  pathBytes,
  pathText,
  printableName,
} from '../../src/acquisition/file-name.ts';

describe('a file name from outside', () => {
  it.each([
    ['blower-1_2026.wav', null],
    ['größe (2) – ß.wav', null],
    ['録音.wav', null],
    ['a\nb.wav', /control characters/],
    ['a\u0000b', /control characters/],
    ['a\u0085b', /control characters/],
    ['a\u2028b', /control characters/],
    ['gpj.\u202evaw', /reading direction/],
    ['x'.repeat(255), null],
    ['x'.repeat(256), /256 bytes, more than 255/],
    ['ü'.repeat(128), /256 bytes/],
  ])('%j is judged', (name, problem) => {
    const found = nameProblem(Buffer.from(name));
    if (problem === null) expect(found).toBeNull();
    else expect(found).toMatch(problem);
  });

  it('comes back from the text it is kept as, whatever its bytes', () => {
    fc.assert(
      fc.property(fc.uint8Array({ maxLength: 60 }), (bytes) => {
        expect(pathBytes(pathText(bytes))).toEqual(Buffer.from(bytes));
      }),
      { seed: 20261201, numRuns: 1000 },
    );
    expect(pathText(Buffer.from('sub/a.wav'))).toBe('sub/a.wav');
    expect(pathText(Buffer.from('bytes:00'))).toBe('bytes:62797465733a3030');
  });

  it('is shown in one line without control characters, at most 120 letters long', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary', maxLength: 300 }), (name) => {
        const shown = printableName(pathText(Buffer.from(name)));
        expect(shown).not.toMatch(/[\p{Cc}\p{Zl}\p{Zp}\u202a-\u202e\u2066-\u2069]/u);
        expect(shown.length).toBeLessThanOrEqual(120);
      }),
      { seed: 20261201, numRuns: 1000 },
    );
    expect(printableName('a\u001b]0;x\u0007.wav')).toBe('a\\x1b]0;x\\x07.wav');
  });

  it('is cut at a whole letter and keeps its ending where it must fit', () => {
    expect(fitName('a.wav')).toBe('a.wav');
    const cut = fitName(`${'録'.repeat(84)}.wav`);
    expect(cut).toMatch(/^録+\.wav$/);
    expect(Buffer.byteLength(cut)).toBeLessThanOrEqual(longestFiledNameBytes);
    expect(Buffer.byteLength(cut)).toBeGreaterThan(longestFiledNameBytes - 3);
    expect(Buffer.byteLength(fitName(`a.${'x'.repeat(250)}`))).toBe(longestFiledNameBytes);
  });

  it('is made up where it cannot be kept, with a plain ending at most', () => {
    const sha256 = 'abcdef0123456789';
    expect(madeUpName(Buffer.from([0xff, 0x2e, 0x77, 0x61, 0x76]), sha256)).toBe('unnamed-abcdef01.wav');
    expect(madeUpName(Buffer.from('a.\u202e'), sha256)).toBe('unnamed-abcdef01');
    expect(madeUpName(Buffer.from('a.\nsh'), sha256)).toBe('unnamed-abcdef01');
  });
});
