import { expect, it } from 'vitest';
import { parseSidecar } from '../../src/acquisition/sidecar.ts';
import { judgeName } from './judge-names.ts';
import { judge } from './judge-spoilt.ts';
import { spoiltContainer } from './spoilt-containers.ts';
import { hostileName, spoiltRecording, spoiltSidecar, wholeRecording } from './spoilt-recordings.ts';

const seed = 20261201;

/** How often each answer came; a failure says which number it was. */
async function tally(
  count: number,
  answerTo: (number: number) => string | Promise<string>,
): Promise<Map<string, number>> {
  const answers = new Map<string, number>();
  for (let number = 0; number < count; number++) {
    try {
      const answer = await answerTo(number);
      answers.set(answer, (answers.get(answer) ?? 0) + 1);
    } catch (error) {
      throw new Error(`number ${number} of seed ${seed}`, { cause: error });
    }
  }
  return answers;
}

it('5,000 spoilt recordings: each ends with finite numbers or one line of reason, in bounded reads', async () => {
  const answers = await tally(5000, (number) => judge(spoiltRecording(seed, number)));
  // Every kind of answer must come up, or the spoiling does not reach far enough.
  for (const kind of ['measured', 'foreign', 'damaged', 'unsupported'])
    expect(answers.get(kind), kind).toBeGreaterThan(250);
  expect(answers.get('nothing measured')).toBeGreaterThan(0);
});

it.each([
  ['UFF 58', 1500],
  ['NPY', 1500],
  ['HDF5', 200],
] as const)(
  'spoilt %s files (%i): each ends with finite numbers or one line of reason',
  async (kind, count) => {
    const answers = await tally(count, (number) => judge(spoiltContainer(kind, seed, number)));
    for (const answer of ['measured', 'damaged', 'foreign'])
      expect(answers.get(answer), answer).toBeGreaterThan(count / 50);
  },
);

it('2,000 spoilt sidecars: refused in one line, or such that a recording is measured in finite numbers', async () => {
  const answers = await tally(2000, (number) => {
    const sidecar = parseSidecar(spoiltSidecar(seed, number));
    if (!('reason' in sidecar)) return judge(wholeRecording(number), sidecar);
    expect(sidecar.reason).toMatch(/^sidecar: [^\n\r\0]{3,400}$/);
    return 'refused';
  });
  for (const kind of ['refused', 'measured']) expect(answers.get(kind), kind).toBeGreaterThan(250);
});

it('5,000 hostile names: shown, kept, patterned and filed without leading anywhere else', async () => {
  const answers = await tally(5000, (number) => judgeName(hostileName(seed, number)));
  for (const kind of ['taken', 'no point', 'unusable']) expect(answers.get(kind), kind).toBeGreaterThan(5);
});
