import { expect, it } from 'vitest';
import { mailPictures } from '../../src/service/mail-pictures.ts';

const size = { widthPx: 200, heightPx: 100 };
const words = { subject: 'a', text: 'b', html: 'c' };

it('a picture that cannot be drawn is left out and named; the others and the mail leave', () => {
  const broken = {
    get series(): never {
      throw new Error('no such chart');
    },
  };
  const undrawn: string[][] = [];
  const pictures = [
    { name: 'trend-1', option: broken, size },
    { name: 'trend-2', option: { title: { text: 'whole' } }, size },
  ];
  const drawn = mailPictures({ ...words, pictures }, (name, reason) => undrawn.push([name, reason]));
  expect(undrawn).toEqual([['trend-1', 'no such chart']]);
  expect(drawn.map(({ name }) => name)).toEqual(['trend-2']);
  expect(drawn[0].png.length).toBeGreaterThan(100);
  expect(mailPictures(words, () => undefined)).toEqual([]);
});
