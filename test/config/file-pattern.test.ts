import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  commonName,
  expandPattern,
  parseFilePattern,
  parseFilesRegex,
  parseStartPattern,
} from '../../src/config/file-pattern.ts';
import { complaints, exampleWith } from './site-parts.ts';

describe('file patterns', () => {
  it('that may take the same name are found, with such a name', () => {
    const name = (a: string, b: string) =>
      commonName(expandPattern(a, 'b-1', 'p'), expandPattern(b, 'b-10', 'q'));
    expect(name('<machine>_<any>.wav', '<machine>_<any>.wav')).toBeNull();
    expect(name('<machine><any>.wav', '<machine><any>.wav')).toBe('b-10.wav');
    expect(name('<any>/x.csv', 'a/<any>')).toBe('a/x.csv');
    expect(name('<any>.csv', 'a/<any>.csv')).toBeNull(); // <any> is no /
    expect(name('<any>_<point>.csv', '<machine>_<any>.csv')).toBe('b-10_p.csv');
    expect(name('<any>', '<any>')).toBe('');
  });

  it('agree with trying every short name', () => {
    const pattern = fc
      .array(fc.constantFrom('<any>', 'a', 'b', '/'), { minLength: 1, maxLength: 5 })
      .map((parts) => parts.join(''));
    const names: string[] = [''];
    for (let begin = 0, length = 0; length < 6; length++) {
      const end = names.length;
      for (; begin < end; begin++) for (const letter of 'ab/') names.push(names[begin] + letter);
    }
    const regex = (text: string) => new RegExp(`^${text.replaceAll('<any>', '[^/]*')}$`);
    fc.assert(
      fc.property(pattern, pattern, (a, b) => {
        const found = commonName(expandPattern(a, 'm', 'p'), expandPattern(b, 'm', 'p'));
        const [one, other] = [regex(a), regex(b)];
        if (found === null) expect(names.filter((text) => one.test(text) && other.test(text))).toEqual([]);
        else expect([one.test(found), other.test(found)]).toEqual([true, true]);
      }),
      { seed: 20261201, numRuns: 300 },
    );
  });

  it('of a regular expression run in linear time, or are refused', () => {
    expect(parseFilesRegex('^p(?P<n>\\d+)_.*\\.csv$').ok).toBe(true);
    for (const bad of ['(?=a)', '(?!a)', '(?<=a)', '(?<!a)', '(a)\\1', '(a', 'a**', '[z-a]']) {
      expect([bad, parseFilesRegex(bad).ok]).toEqual([bad, false]);
    }
    expect(parseFilesRegex('a\\\\1').ok).toBe(true);
  });

  it('say what is wrong with them', () => {
    expect(parseFilePattern('a\\<any>.wav')).toMatchObject({ instead: 'a/<any>.wav' });
    expect(parseFilePattern('<machine>_<year>.wav').ok).toBe(false);
    expect(parseFilePattern('../<any>').ok).toBe(false);
    expect(parseFilePattern('a//b').ok).toBe(false);
    expect(parseFilePattern('<any').ok).toBe(false);
    expect(parseStartPattern('<year>-<month>-<day>_<hour>-<minute>').ok).toBe(true);
    expect(parseStartPattern('<year><year><month><day><hour><minute>').ok).toBe(false);
    expect(parseStartPattern('<year><mnth><day><hour><minute>')).toMatchObject({
      instead: '<year><month><day><hour><minute>',
    });
  });

  it('that two points share tell where the first stands, also by one regular expression', () => {
    const told = complaints(exampleWith(['files: <machine>_<any>.wav', "files_regex: '^b.*$'"]));
    expect(told).toEqual([
      'site.yaml:99:18: blower-2/de-h and blower-1/de-h (line 74) claim channel 1 of the same file, such as by the same files_regex; write: channel: 2, or tell the files apart by <machine>_ and <point>_ in files:',
    ]);
  });
});
