/** What draft makes of file names alone: series, ids, dates, patterns. No disk. */
import fc from 'fast-check';
import { RE2JS } from 're2js';
import { describe, expect, it } from 'vitest';
import { fillPattern, pathTest } from '../../src/acquisition/path-pattern.ts';
import { namePattern, startInName } from '../../src/acquisition/start-in-name.ts';
import type { NamedFile } from '../../src/cli/draft/name-parts.ts';
import { nameSeries } from '../../src/cli/draft/name-series.ts';
import { seriesIds } from '../../src/cli/draft/series-ids.ts';
import { filesSettings } from '../../src/cli/draft/series-pattern.ts';

const hourMs = 3_600_000;
const beginMs = Date.UTC(2026, 2, 2, 21);

const files = (paths: readonly string[], stepMs = hourMs): NamedFile[] =>
  paths.map((path, n) => ({ path, mtimeMs: beginMs + n * stepMs }));

/** Machine and point ids with the pattern that draft finds for the names, a line a series. */
function found(given: readonly NamedFile[]): string[] {
  return describeSeries(given).map(
    ({ machineId, pointId, setting }) => `${machineId || '-'} ${pointId || '-'} ${setting.text}`,
  );
}

function describeSeries(given: readonly NamedFile[], others: readonly string[] = []) {
  const named = nameSeries(given).map((series) => {
    const ids = seriesIds(series);
    const byName = ids.point !== null;
    return { series, ...ids, pointId: ids.pointId, byName };
  });
  const settings = filesSettings(
    named.map((one) => ({
      series: one.series,
      machine: one.machine !== null && one.machine.text === one.machineId ? one.machine : null,
      point: one.byName ? one.point : null,
      machineId: one.machineId,
      pointId: one.byName ? one.pointId : null,
    })),
    others,
  );
  return named.map((one, n) => ({ ...one, setting: settings[n] as (typeof settings)[number] }));
}

/** Every date layout that a logger might use, by an example of 2 March 2026, 21:15:30, and the pattern for it. */
const dated: readonly (readonly [text: (iso: string) => string, pattern: string])[] = [
  [
    (d) => `${d.slice(0, 4)}${d.slice(5, 7)}${d.slice(8, 10)}T${hms(d, '')}Z`,
    '<year><month><day>T<hour><minute><second>Z',
  ],
  [(d) => `${d.slice(0, 10)}_${hms(d, '-')}`, '<year>-<month>-<day>_<hour>-<minute>-<second>'],
  [(d) => `${d.slice(0, 10)} ${hms(d, '.')}`, '<year>-<month>-<day> <hour>.<minute>.<second>'],
  [(d) => `${d.slice(0, 10).replaceAll('-', '')}${hms(d, '')}`, '<year><month><day><hour><minute><second>'],
  [
    (d) => `${d.slice(0, 10).replaceAll('-', '')}_${hms(d, '').slice(0, 4)}`,
    '<year><month><day>_<hour><minute>',
  ],
  [
    (d) => `${d.slice(8, 10)}.${d.slice(5, 7)}.${d.slice(0, 4)}_${hms(d, '')}`,
    '<day>.<month>.<year>_<hour><minute><second>',
  ],
  [(d) => `${d.slice(0, 10)}_${d.slice(11, 13)}h${d.slice(14, 16)}`, '<year>-<month>-<day>_<hour>h<minute>'],
];

function hms(iso: string, mark: string): string {
  return [iso.slice(11, 13), iso.slice(14, 16), iso.slice(17, 19)].join(mark);
}

describe('names of files', () => {
  it('with a machine and a date give one series a machine', () => {
    const names = ['blower-1', 'pump-2'].flatMap((id) => [
      `${id}_20260302T210000Z.wav`,
      `${id}_20260303T000000Z.wav`,
    ]);
    expect(found(files(names))).toEqual(['blower-1 - <machine>_<any>.wav', 'pump-2 - <machine>_<any>.wav']);
  });

  it('with places of measurement give a point each', () => {
    const names = ['de-v', 'nde-v'].flatMap((id) => [
      `pump-2_${id}_20260302T2100.csv`,
      `pump-2_${id}_20260303T0000.csv`,
    ]);
    expect(found(files(names))).toEqual([
      'pump-2 de-v <machine>_<point>_<any>.csv',
      'pump-2 nde-v <machine>_<point>_<any>.csv',
    ]);
  });

  it('with folders take the folder for the machine', () => {
    const names = ['pump 2/inlet', 'pump 2/outlet'].flatMap((id) => [
      `${id}_0001.wav`,
      `${id}_0002.wav`,
      `${id}_0003.wav`,
    ]);
    expect(found(files(names))).toEqual([
      'pump-2 inlet pump 2/<point>_<any>.wav',
      'pump-2 outlet pump 2/<point>_<any>.wav',
    ]);
  });

  it('with nothing but a counter are one series of one machine', () => {
    expect(found(files(['REC0001.WAV', 'REC0002.WAV', 'REC0003.WAV']))).toEqual(['REC - <machine><any>.WAV']);
    expect(found(files(['REC0017.WAV']))).toEqual(['REC - <machine><any>.WAV']);
  });

  it('that count within each machine are told from the number of the machine', () => {
    const names = [1, 2, 3, 4, 5].flatMap((n) =>
      [1, 2, 3].map((m) => ({ path: `fan${m}_${n}.wav`, mtimeMs: beginMs + n * hourMs + m * 900 })),
    );
    expect(found(names)).toEqual([
      'fan1 - <machine>_<any>.wav',
      'fan2 - <machine>_<any>.wav',
      'fan3 - <machine>_<any>.wav',
    ]);
  });

  it('of a single moment with short numbers are several machines', () => {
    expect(found(files(['pump1.wav', 'pump2.wav', 'pump3.wav'], 500))).toEqual(
      ['pump1', 'pump2', 'pump3'].map((id) => `${id} - <machine>.wav`),
    );
  });

  it('of machine and point in one word with - are parted at the machine', () => {
    const names = ['blower-1-de-h', 'blower-1-de-v', 'blower-2-de-h', 'blower-2-de-v'].flatMap((id) => [
      `${id}_20260302210000.wav`,
      `${id}_20260302220000.wav`,
    ]);
    expect(found(files(names)).map((line) => line.split(' ').slice(0, 2).join(' '))).toEqual([
      'blower-1 de-h',
      'blower-1 de-v',
      'blower-2 de-h',
      'blower-2 de-v',
    ]);
  });

  it.each(dated)('give the start by the layout of %s', (text, pattern) => {
    const given = [0, 3, 6, 30].map((hours) => {
      const ms = beginMs + hours * hourMs + 15 * 60_000 + 30_000;
      return { path: `mixer-3_${text(new Date(ms).toISOString())}.wav`, mtimeMs: ms + 9000 };
    });
    const [series, ...more] = nameSeries(given);
    expect(more).toEqual([]);
    expect(series?.date?.pattern).toBe(pattern);
    const whole = pattern.includes('<second>') ? 0 : 30_000;
    expect(series?.date?.readings).toEqual(given.map(({ mtimeMs }) => mtimeMs - 9000 - whole));
    expect(series?.date?.agrees).toBe(true);
  });

  it('with a date in the folder and the time in the name give the start from both', () => {
    const given = files([
      '2026-03-02/pump-2_210000.wav',
      '2026-03-02/pump-2_220000.wav',
      '2026-03-03/pump-2_010000.wav',
    ]);
    expect(found(given)).toEqual(['pump-2 - <any>/<machine>_<any>.wav']);
    expect(nameSeries(given)[0]?.date?.pattern).toBe('<year>-<month>-<day>/<any>_<hour><minute><second>');
  });

  it('do not give a start where the times of change run the other way', () => {
    const names = [0, 1, 2, 3, 4].map((n) => ({
      path: `a_2026030${n + 1}T000000.wav`,
      mtimeMs: beginMs - n * hourMs,
    }));
    expect(nameSeries(names)[0]?.date?.agrees).toBe(false);
  });

  it('are held letter by letter where <any> would take a stranger', () => {
    const [only] = describeSeries(files(['a1_0001.wav', 'a1_0002.wav', 'a1_0003.wav']), ['a1_old.wav']);
    expect(only?.setting).toEqual({ key: 'files_regex', text: '^a1_[0-9]{4}\\.wav$' });
  });
});

describe('names that hold more than one date', () => {
  it('give the start by the one that differs from recording to recording', () => {
    const given = files([1, 2, 3].map((n) => `made-2019-12-31_2359_fan-1_2026030${n}T210000.wav`));
    expect(nameSeries(given)[0]?.date?.pattern).toBe('<year><month><day>T<hour><minute><second>');
  });
});

describe('a date that stands behind another of the same layout', () => {
  it('is not taken for the start, since the service would read the first', () => {
    const given = files([1, 2, 3].map((n) => `20191231T235900_fan-1_2026030${n}T210000.wav`));
    const date = nameSeries(given)[0]?.date;
    expect(date?.readings).not.toContain(Date.UTC(2026, 2, 2, 21));
  });
});

describe('patterns that could meet in a file to come', () => {
  it('are both held letter by letter', () => {
    const names = [
      'a_20260302T210000_x.wav',
      'a_20260303T210000_x.wav',
      'a_y_20260302T210000.wav',
      'a_y_20260303T210000.wav',
    ];
    expect(describeSeries(files(names)).map(({ setting }) => setting.key)).toEqual([
      'files_regex',
      'files_regex',
    ]);
  });
});

describe('patterns from random names', () => {
  const word = fc.oneof(
    fc.constantFrom(
      'pump',
      'fan',
      'Gebläse',
      'de',
      'nde',
      'h',
      'v',
      'rec',
      'data',
      'x<1>',
      'a*b',
      '(c)',
      'm+n',
      "o'",
      '100%',
      '#3',
      '20240229_101500',
      '2019-12-31_2359',
    ),
    fc.stringMatching(/^[a-zA-Z0-9]{1,6}$/),
  );
  const mark = fc.constantFrom('_', '-', '.', ' ', '/', '');
  const varying = fc.constantFrom('counter', 'padded', 'date', 'none');
  const family = fc.record({
    words: fc.array(fc.tuple(word, mark), { minLength: 1, maxLength: 4 }),
    varying,
    count: fc.integer({ min: 1, max: 6 }),
    ending: fc.constantFrom('.wav', '.csv', '.WAV', ''),
  });
  const folder = fc.array(family, { minLength: 1, maxLength: 5 }).map((families) => {
    const paths = families.flatMap(({ words, varying: kind, count, ending }) =>
      Array.from({ length: count }, (_, n) => {
        const iso = new Date(beginMs + n * hourMs).toISOString();
        const tail =
          kind === 'counter'
            ? `${n}`
            : kind === 'padded'
              ? String(n).padStart(4, '0')
              : kind === 'date'
                ? iso.slice(0, 19).replaceAll(':', '')
                : '';
        return `${words.map(([text, between]) => text + between).join('')}${tail}${ending}`;
      }),
    );
    return [...new Set(paths)].filter((path) => !path.startsWith('/') && !/\/\/|\/$|^$/.test(path));
  });

  it('take each file by its own series and no other', () => {
    fc.assert(
      fc.property(folder, fc.infiniteStream(fc.integer({ min: 0, max: 100_000_000 })), (paths, times) => {
        const given = paths.map((path) => ({ path, mtimeMs: beginMs + (times.next().value as number) }));
        const others = given.filter((_, n) => n % 7 === 3).map(({ path }) => path);
        const all = describeSeries(given.filter(({ path }) => !others.includes(path)));
        const settings = describeSeries(
          given.filter(({ path }) => !others.includes(path)),
          others,
        );
        expect(all.flatMap(({ series }) => series.files)).toHaveLength(given.length - others.length);
        for (const { date, files: own } of all.map(({ series }) => series)) {
          if (date === null) continue;
          const pattern = namePattern(date.pattern);
          expect(own.map(({ path }) => startInName(pattern, path)?.ms)).toEqual(date.readings);
        }
        for (const [index, { setting, machineId, pointId }] of settings.entries()) {
          const regex = setting.key === 'files_regex' ? RE2JS.compile(setting.text) : null;
          const plain = pathTest(fillPattern(setting.text, machineId, pointId));
          const takes = (path: string) => (regex === null ? plain(path) : regex.matcher(path).matches());
          for (const [owner, { series }] of settings.entries()) {
            for (const { path } of series.files) expect([path, takes(path)]).toEqual([path, owner === index]);
          }
          // A file of the same structure as a series cannot be told from it; those are left to the series as a whole.
          if (setting.key === 'files')
            for (const path of others) expect([path, takes(path)]).toEqual([path, false]);
        }
      }),
      { seed: 20261201, numRuns: 400 },
    );
  });
});
