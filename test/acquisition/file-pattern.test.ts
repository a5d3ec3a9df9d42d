import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { explainMismatch, isNoRecording, siteFiles } from '../../src/acquisition/file-pattern.ts';
import { pathTest, patternDistance } from '../../src/acquisition/path-pattern.ts';
import { type Point, pointPath, type RecordingSettings, type Site } from '../../src/config/site.ts';
import { testPoint } from '../manipulation/point.ts';
import { listOf } from './lists.ts';

function pointWith(machineId: string, id: string, recordings: Partial<RecordingSettings>): Point {
  const point = testPoint({ machineId, id });
  return { ...point, recordings: { ...point.recordings, files: null, ...recordings } };
}

/** Only what the patterns need of a site. */
function siteOf(...points: Point[]): Site {
  const machineIds = [...new Set(points.map((point) => point.machineId))];
  const machines = machineIds.map((id) => ({ id, points: points.filter((point) => point.machineId === id) }));
  return { machines } as unknown as Site;
}

const siteWith = (files: string) =>
  siteOf(pointWith('blower-1', 'de-h', { files }), pointWith('blower-1', 'nde-v', { files }));

const names = (points: readonly Point[]) => points.map(pointPath);

describe('a file pattern', () => {
  it.each(listOf('taken.txt'))('%s takes %s as %s', (pattern, path, source) => {
    const files = siteFiles(siteWith(pattern));
    expect(names(files.pointsFor(path))[0]).toBe('blower-1/de-h');
    expect(files.sourceOf(path)).toBe(source);
  });

  it.each(listOf('not-taken.txt'))('%s does not take %s: %s', (pattern, path, said) => {
    const site = siteWith(pattern);
    expect(siteFiles(site).pointsFor(path)).toEqual([]);
    expect(siteFiles(site).sourceOf(path)).toBeNull();
    expect(explainMismatch(path, site).text).toMatch(/^nearest pattern .* \(blower-1\/de-h/);
    expect(explainMismatch(path, site).text.endsWith(`: ${said}`), explainMismatch(path, site).text).toBe(
      true,
    );
  });

  it('takes the same paths as a plain search of every way to fill the gaps', () => {
    const letters = fc.constantFrom('a', 'b', '_', '/');
    const pattern = fc.array(fc.oneof(letters, fc.constant('<any>')), { minLength: 1, maxLength: 8 });
    const path = fc.array(letters, { maxLength: 8 });
    fc.assert(
      fc.property(pattern, path, (parts, text) => {
        const fits = (p: number, t: number): boolean => {
          if (p === parts.length) return t === text.length;
          if (parts[p] !== '<any>') return parts[p] === text[t] && fits(p + 1, t + 1);
          return fits(p + 1, t) || (t < text.length && text[t] !== '/' && fits(p, t + 1));
        };
        const filled = parts.join('');
        expect(pathTest(filled)(text.join(''))).toBe(fits(0, 0));
        expect(patternDistance(text.join(''), filled).distance === 0).toBe(fits(0, 0));
      }),
      { seed: 20261201, numRuns: 3000 },
    );
  });
});

describe('the files of a site', () => {
  it('belong to every point whose pattern takes them, in the order of the site file', () => {
    const shared = '<any>_plant.wav';
    const files = siteFiles(
      siteOf(
        pointWith('blower-1', 'de', { files: shared }),
        pointWith('blower-1', 'nde', { files: '<machine>_<point>_<any>.wav' }),
        pointWith('pump-2', 'de', { files: shared }),
      ),
    );
    expect(names(files.pointsFor('x_plant.wav'))).toEqual(['blower-1/de', 'pump-2/de']);
    expect(names(files.pointsFor('blower-1_nde_1.wav'))).toEqual(['blower-1/nde']);
    expect(files.sources.map(({ source, points }) => `${source}: ${names(points)}`)).toEqual([
      '<any>_plant.wav: blower-1/de,pump-2/de',
      'blower-1_nde_<any>.wav: blower-1/nde',
    ]);
  });

  it('lie directly in the drop folder where a point names no pattern', () => {
    const files = siteFiles(siteOf(pointWith('blower-1', 'de', {})));
    expect(files.pointsFor('a.wav')).toHaveLength(1);
    expect(files.pointsFor('sub/a.wav')).toEqual([]);
  });

  it('may be named by a regular expression, whole, with the ids in named groups', () => {
    const filesRegex = '(?P<machine>[a-z]+-[0-9])[._](?P<point>[a-z]+)[0-9]*\\.wav';
    const files = siteFiles(
      siteOf(pointWith('blower-1', 'de', { filesRegex }), pointWith('blower-2', 'de', { filesRegex })),
    );
    expect(names(files.pointsFor('blower-2.de17.wav'))).toEqual(['blower-2/de']);
    expect(files.pointsFor('xblower-2.de17.wav')).toEqual([]);
    expect(files.pointsFor('blower-2.de17.wav.tmp')).toEqual([]);
    expect(files.sourceOf('blower-2.de17.wav')).toBe(`${filesRegex} machine=blower-2 point=de`);
  });

  it('are looked for in time that grows with their length only', () => {
    const site = siteOf(
      pointWith('blower-1', 'a', { filesRegex: '(a+)+b' }),
      pointWith('blower-1', 'b', { files: `${'<any>a'.repeat(50)}b` }),
    );
    const files = siteFiles(site);
    const before = performance.now();
    for (let n = 0; n < 100; n++) expect(files.pointsFor('a'.repeat(200))).toEqual([]);
    expect(performance.now() - before).toBeLessThan(5000);
  });

  it('are none where they are hidden, unfinished, sidecars, or to be ignored', () => {
    for (const path of ['.a.wav', 'x/.y/a.wav', 'a.wav.part', 'a.PART', 'a.json']) {
      expect(isNoRecording(path), path).toBe(true);
    }
    const site = siteOf(
      pointWith('blower-1', 'de', { files: '<any>', ignore: ['<any>.tmp', 'old/<any>'] }),
      pointWith('pump-2', 'de', { files: '<machine>_<any>' }),
    );
    const files = siteFiles(site);
    expect(files.isIgnored('a.tmp')).toBe(true);
    expect(files.isIgnored('some/where/a.tmp')).toBe(true);
    expect(files.isIgnored('old/a.wav')).toBe(true);
    expect(files.isIgnored('a.wav')).toBe(false);
    // Another point, which ignores nothing, takes it.
    expect(files.isIgnored('pump-2_a.tmp')).toBe(false);
    expect(names(files.pointsFor('pump-2_a.tmp'))).toEqual(['pump-2/de']);
  });

  it('are sorted quickly: 10,000 files, 60 points', () => {
    const points = Array.from({ length: 60 }, (_, n) =>
      pointWith(`m-${n >> 1}`, n % 2 ? 'a' : 'b', { files: '<machine>_<point>_<any>.wav' }),
    );
    const files = siteFiles(siteOf(...points));
    let taken = 0;
    for (let n = 0; n < 10_000; n++) taken += files.pointsFor(`m-${n % 30}_a_${n}.wav`).length;
    expect(taken).toBe(10_000);
  });
});

describe('a name that no point takes', () => {
  it('is explained by the pattern that comes nearest, of many', () => {
    const site = siteOf(
      pointWith('pump-2', 'de', { files: '<machine>_<any>.wav' }),
      pointWith('blower-1', 'de', { files: '<machine>_<any>.wav' }),
    );
    expect(explainMismatch('blower1_2026.wav', site)).toEqual({
      nearest: 'blower-1_<any>.wav',
      points: ['blower-1/de'],
      differsAt: 7,
      text: 'nearest pattern blower-1_<any>.wav (blower-1/de): differs from character 7 on, at "1_2026.wav"',
    });
  });

  it('is shown without what it could do to a terminal', () => {
    const { text } = explainMismatch('blower-1\u001b[31mx.wav', siteWith('<machine>_<any>.wav'));
    expect(text).toContain('"\\x1b[31mx.wav"');
  });

  it.each([
    ['<machine>_<any>.wav', 'visitor.wav'],
    ['<machine>_<any>.wav', 'report.pdf'],
    ['<machine>_<point>_<any>.wav', '2026-11-03.wav'],
    ['<any>.wav', 'notes.txt'],
    ['incoming/<machine>_<any>.wav', 'incoming/minutes of Tuesday.docx'],
  ])('is not held against %s where it is as unlike as %s', (pattern, path) => {
    expect(explainMismatch(path, siteWith(pattern))).toEqual({
      nearest: null,
      points: [],
      differsAt: null,
      text: 'no pattern of the site file is near this name',
    });
  });

  it('is near in spite of folders and capitals', () => {
    const { nearest, text } = explainMismatch(
      'Old Recordings/2026/BLOWER-1_x.wav',
      siteWith('<machine>_<any>.wav'),
    );
    expect(nearest).toBe('blower-1_<any>.wav');
    expect(text).toContain('the file lies in a subfolder that the pattern does not name');
  });

  it('is answered where there are regular expressions only, and where it is absurdly long', () => {
    const regex = siteOf(pointWith('blower-1', 'de', { filesRegex: 'a' }));
    expect(explainMismatch('b', regex)).toMatchObject({ nearest: null, differsAt: null });
    expect(explainMismatch('b'.repeat(1e6), siteWith('<machine>_<any>.wav'))).toMatchObject({
      nearest: null,
    });
  });
});
