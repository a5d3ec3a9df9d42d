import { describe, expect, test } from 'vitest';
import { parseSuppressedWhile, suppressedWhileText } from '../../src/config/suppressed-while.ts';
import { complaints, siteOf } from './site-parts.ts';

/** Two pumps; lines are put in at their places, and the level of indentation is that of the place. */
function site(
  at: {
    readonly top?: string;
    readonly typeLimit?: string;
    readonly pump1?: string;
    readonly pump2?: string;
    readonly point?: string;
    readonly limit?: string;
  } = {},
): string {
  const line = (indent: number, text: string | undefined) =>
    text === undefined ? '' : `${' '.repeat(indent)}${text}\n`;
  const recordings = 'recordings:\n  files: <machine>_<any>.wav\n  samples_in: mm/s\n';
  const points = (ids: readonly string[]) =>
    ids.map((id, n) => `      - id: ${id}\n        channel: ${n + 1}\n        quantity: velocity\n`).join('');
  return `site: Larkfen Waterworks
time_zone: Europe/Dublin
${at.top === undefined ? '' : `${at.top}\n`}folders:
  drop: ./drop
  data: ./data
${recordings}machine_types:
  pump:
    bands:
      - id: overall
        from: 10 Hz
        to: 1000 Hz
    limits:
      - band: overall
        alert: 2.8 mm/s
${line(8, at.typeLimit)}machines:
  - id: pump-1
    type: pump
${line(4, at.pump1)}    points:
${points(['de-v', 'nde-v'])}${line(8, at.point)}${at.limit === undefined ? '' : `        limits:\n          - band: overall\n            danger: 4.5 mm/s\n            id: own\n            ${at.limit}\n`}  - id: pump-2
    type: pump
    running: speed above 300 rpm
${line(4, at.pump2)}    points:
${points(['de-v'])}`;
}

const suppressions = (text: string) =>
  Object.fromEntries(
    siteOf(text).machines.flatMap(({ points }) =>
      points.flatMap(({ machineId, id, limits }) =>
        limits.map((limit) => [
          `${machineId}/${id} ${limit.id}`,
          (limit.suppressedWhile ?? []).map(suppressedWhileText),
        ]),
      ),
    ),
  );

describe('suppressed_while', () => {
  test.each([
    ['trouble of pump-2/de-v', { by: 'trouble', machineId: 'pump-2', pointId: 'de-v' }],
    ['trouble of pump-2', { by: 'trouble', machineId: 'pump-2', pointId: null }],
    ['pump-2  is stopped', { by: 'machine', machineId: 'pump-2', state: 'stopped' }],
    ['pump-2 transient', { by: 'machine', machineId: 'pump-2', state: 'transient' }],
    ['trouble running', { by: 'machine', machineId: 'trouble', state: 'running' }],
  ])('%s is understood', (text, meant) => {
    expect(parseSuppressedWhile(text)).toEqual({ ok: true, value: meant });
  });

  test.each([
    ['pump-2/de-v', 'trouble of pump-2/de-v'],
    ['pump-2 stoped', 'pump-2 stopped'],
    ['pump-2 stopped and running', null],
    ['', null],
  ])("'%s' is refused, with what was most likely meant", (text, instead) => {
    expect(parseSuppressedWhile(text)).toMatchObject({ ok: false, instead });
  });

  test('of machine, point and limit add up for each limit', () => {
    const all = suppressions(
      site({
        pump1: 'suppressed_while: [pump-2 stopped]',
        point: 'suppressed_while: [trouble of pump-2/de-v, pump-2 stopped]',
        limit: 'suppressed_while: [trouble of pump-1/de-v]',
      }),
    );
    expect(all).toEqual({
      'pump-1/de-v overall-fixed-upper': ['pump-2 stopped'],
      'pump-1/nde-v overall-fixed-upper': ['trouble of pump-2/de-v', 'pump-2 stopped'],
      'pump-1/nde-v own': ['trouble of pump-1/de-v', 'trouble of pump-2/de-v', 'pump-2 stopped'],
      'pump-2/de-v overall-fixed-upper': [],
    });
  });

  test("a machine's condition leaves out the point whose own trouble it names", () => {
    const all = suppressions(site({ pump1: 'suppressed_while: [trouble of pump-1/de-v]' }));
    expect(all['pump-1/de-v overall-fixed-upper']).toEqual([]);
    expect(all['pump-1/nde-v overall-fixed-upper']).toEqual(['trouble of pump-1/de-v']);
  });

  test('of a machine type hold for the other machines: none hides its own levels', () => {
    const all = suppressions(
      site({ typeLimit: 'suppressed_while: [trouble of pump-2, pump-2 running, pump-2 stopped]' }),
    );
    expect(all['pump-1/de-v overall-fixed-upper']).toEqual([
      'trouble of pump-2',
      'pump-2 running',
      'pump-2 stopped',
    ]);
    expect(all['pump-2/de-v overall-fixed-upper']).toEqual(['pump-2 stopped']);
  });

  test.each([
    [
      { point: 'suppressed_while: [trouble of pump-1/nde-v]' },
      'what is wrong with a point never hides its levels',
    ],
    [{ point: 'suppressed_while: [trouble of pump-2/de-h]' }, "names point 'de-h', which pump-2 has not"],
    [{ pump1: 'suppressed_while: [pump-3 stopped]' }, 'write: suppressed_while: [pump-1 stopped]'],
    [{ typeLimit: 'suppressed_while: [fan-9 stopped]' }, "names machine 'fan-9', which is not in this file"],
    [
      { pump2: 'suppressed_while: [pump-1 stopped]' },
      'pump-1 has no running:, so it never counts as stopped',
    ],
    [{ pump1: 'suppressed_while: [pump-2 transient]' }, 'pump-2 has no after_start:'],
    [
      { pump2: 'suppressed_while: [pump-1 running]' },
      'pump-1 has no running:, so it always counts as running',
    ],
    [{ pump2: 'suppressed_while: [pump-2 running]' }, 'held back then, they could never alarm'],
    [{ limit: 'suppressed_while: [pump-1 running]' }, 'held back then, they could never alarm'],
    [{ pump1: 'suppressed_while: [trouble of pump-1]' }, 'the trouble of pump-1 is that of its own points'],
    [{ point: 'suppressed_while: [trouble of pump-1]' }, 'the trouble of pump-1 is that of its own points'],
    [{ pump1: 'suppressed_while: pump-2 stopped' }, 'suppressed_while is a list'],
  ])('%j is refused at its line', (where, message) => {
    const told = complaints(site(where)).filter((line) => !line.startsWith('warning'));
    expect(told).toHaveLength(1);
    expect(told[0]).toContain(message);
    expect(told[0]).toMatch(/^site\.yaml:\d+:\d+: /);
  });
});

test('the longest shelf is a week, unless the site says otherwise', () => {
  const day = 86_400_000;
  expect(siteOf(site()).shelveAtMostMs).toBe(7 * day);
  expect(siteOf(site({ top: 'shelve_at_most: 12 h' })).shelveAtMostMs).toBe(day / 2);
  expect(complaints(site({ top: 'shelve_at_most: 400 d' }))[0]).toContain('is not from');
});
