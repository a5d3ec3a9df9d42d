import { expect, it } from 'vitest';
import { parseSidecar } from '../../src/acquisition/sidecar.ts';
import { judgeName } from './judge-names.ts';
import { judge } from './judge-spoilt.ts';
import { hostileName, spoiltRecording, spoiltSidecar, wholeRecording } from './spoilt-recordings.ts';

const seed = 20261201;

/** How often each answer came; a failure says which number it was. */
function tally(count: number, answerTo: (number: number) => string): Map<string, number> {
  const answers = new Map<string, number>();
  for (let number = 0; number < count; number++) {
    try {
      const answer = answerTo(number);
      answers.set(answer, (answers.get(answer) ?? 0) + 1);
    } catch (error) {
      throw new Error(`number ${number} of seed ${seed}`, { cause: error });
    }
  }
  return answers;
}

it('5,000 spoilt recordings: each ends with finite numbers or one line of reason, in bounded reads', () => {
  const answers = tally(5000, (number) => judge(spoiltRecording(seed, number)));
  // Every kind of answer must come up, or the spoiling does not reach far enough.
  for (const kind of ['measured', 'foreign', 'damaged', 'unsupported'])
    expect(answers.get(kind), kind).toBeGreaterThan(250);
  expect(answers.get('nothing measured')).toBeGreaterThan(0);
});

it('2,000 spoilt sidecars: refused in one line, or such that a recording is measured in finite numbers', () => {
  const answers = tally(2000, (number) => {
    const sidecar = parseSidecar(spoiltSidecar(seed, number));
    if (!('reason' in sidecar)) return judge(wholeRecording(number), sidecar);
    expect(sidecar.reason).toMatch(/^sidecar: [^\n\r\0]{3,400}$/);
    return 'refused';
  });
  for (const kind of ['refused', 'measured']) expect(answers.get(kind), kind).toBeGreaterThan(250);
});

it('5,000 hostile names: shown, kept, patterned and filed without leading anywhere else', () => {
  const answers = tally(5000, (number) => judgeName(hostileName(seed, number)));
  for (const kind of ['taken', 'no point', 'unusable']) expect(answers.get(kind), kind).toBeGreaterThan(5);
});
