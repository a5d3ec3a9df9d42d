import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { loadSite } from '../../src/config/load.ts';
import { exampleText } from './site-parts.ts';

/** More of them in the long run. */
const times = process.env.HUMLEDGER_LONG === '1' ? 25 : 1;

/** A text changed the way slips of the hand change it: characters lost, doubled, replaced; lines moved, cut, merged. */
const slip = fc.record({
  at: fc.nat(exampleText.length - 1),
  length: fc.nat(12),
  insert: fc.oneof(
    fc.constantFrom(
      '',
      ' ',
      '\t',
      ':',
      ': ',
      '#',
      ',',
      '{',
      '}',
      '[',
      ']',
      "'",
      '"',
      '\\',
      '\n',
      '\n  ',
      '- ',
      '&a ',
      '*a',
      '!x ',
    ),
    fc.constantFrom(
      '|',
      '>',
      '?',
      '---\n',
      '%',
      '@',
      '0',
      '1e9',
      '\u0000',
      '\u2028',
      '\ud800',
      'µ',
      '__proto__',
      '<<: ',
    ),
    fc.string({ maxLength: 6 }),
  ),
});

function changed(text: string, slips: readonly { at: number; length: number; insert: string }[]): string {
  return slips.reduce(
    (now, { at, length, insert }) => now.slice(0, at) + insert + now.slice(at + length),
    text,
  );
}

function expectAnswer(text: string): void {
  const answer = loadSite(text, '/srv/plant/site.yaml');
  const places = answer.ok ? answer.site.warnings : answer.problems;
  if (!answer.ok) expect(answer.problems.length).toBeGreaterThan(0);
  const lines = text.replace(/^\uFEFF/, '').split('\n');
  for (const { line, column } of places) {
    expect(line).toBeGreaterThanOrEqual(1);
    expect(line).toBeLessThanOrEqual(lines.length);
    expect(column).toBeGreaterThanOrEqual(1);
    expect(column).toBeLessThanOrEqual(lines[line - 1].length + 1);
  }
  for (const problem of answer.ok ? [] : answer.problems) {
    expect(problem.what).not.toBe('');
    expect(problem.right).not.toBe('');
    expect(`${problem.what}${problem.right}`).not.toContain('\n');
  }
}

describe('a site file with slips of the hand', () => {
  it('never fails, and every complaint points into the file', () => {
    fc.assert(
      fc.property(fc.array(slip, { minLength: 1, maxLength: 4 }), (slips) =>
        expectAnswer(changed(exampleText, slips)),
      ),
      { seed: 20261201, numRuns: 400 * times },
    );
  });

  it('the same with lines moved and left out', () => {
    const lines = exampleText.split('\n');
    const order = fc.array(fc.nat(lines.length - 1), { minLength: 3, maxLength: 40 });
    fc.assert(
      fc.property(order, fc.nat(lines.length), (moved, keep) => {
        expectAnswer([...lines.slice(0, keep), ...moved.map((index) => lines[index])].join('\n'));
      }),
      { seed: 20261201, numRuns: 200 * times },
    );
  });

  it('and with any text at all', () => {
    fc.assert(fc.property(fc.string({ maxLength: 200 }), expectAnswer), {
      seed: 20261201,
      numRuns: 500 * times,
    });
  });
});
