import { readFileSync, writeFileSync } from 'node:fs';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { csvLine } from '../../src/cli/output.ts';
import { livedInSite, pumpLevels, run, type SmallSite } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await livedInSite();
}, 60_000);
afterAll(() => site.remove());

const trend = (...args: string[]) => run(['trend', ...args, '--site', site.file], { clock: site.clock });

test('JSON gives every level with its interval, in the display unit', async () => {
  const ran = await trend('pump-2/de-v', 'overall', '--json');
  expect(ran).toMatchObject({ status: 0, err: '' });
  const answer = JSON.parse(ran.out);
  expect(answer).toMatchObject({
    machine: 'pump-2',
    point: 'de-v',
    band: 'overall',
    quantity: 'velocity',
    unit: 'mm/s',
    detector: 'rms',
    limits: [{ limit: 'overall-fixed-upper', kind: 'fixed', side: 'upper', alert: 2.8, danger: 7.1 }],
  });
  expect(answer.series).toHaveLength(1);
  expect(answer.levels).toHaveLength(pumpLevels.length);
  for (const [n, level] of pumpLevels.entries()) {
    const row = answer.levels[n];
    expect(row.time).toBe(`2026-03-02T${String(6 + n).padStart(2, '0')}:00:00.000Z`);
    expect(row.level).toBeCloseTo(level, 1);
    expect(row.interval_low).toBeLessThan(row.level);
    expect(row.interval_high).toBeGreaterThan(row.level);
    expect(row).toMatchObject({
      confidence_percent: 95,
      at_least: false,
      in_trend: true,
      machine_state: 'running',
    });
  }
});

test('CSV has the same levels, a heading, and one line a recording', async () => {
  const json = JSON.parse((await trend('pump-2/de-v', 'overall', '--json')).out);
  const lines = (await trend('pump-2/de-v', 'overall', '--csv')).out.trimEnd().split('\r\n');
  const heading = lines[0]?.split(',') ?? [];
  expect(heading.slice(0, 8)).toEqual([
    ...['time', 'machine', 'point', 'band', 'level', 'interval_low', 'interval_high', 'confidence_percent'],
  ]);
  expect(lines.slice(1).map((line) => Number(line.split(',')[4]))).toEqual(
    json.levels.map(({ level }: { level: number }) => level),
  );
});

test('a text that a spreadsheet would run as a formula is defused, a negative number is not touched', () => {
  expect(csvLine(['=1+1', '+2', '-3', '@x', ' =4', -5, 'a,"b"', null, true])).toBe(
    `'=1+1,'+2,'-3,'@x,' =4,-5,"a,""b""",,true\r\n`,
  );
  expect(csvLine(['\t=1'])).toBe(`'\t=1\r\n`);
});

test('people get the limits, which level passes them, and times of the site', async () => {
  const ran = await trend('pump-2/de-v', 'overall');
  expect(ran.status).toBe(0);
  expect(ran.out).toContain('pump-2/de-v overall, mm/s r.m.s.; times of Europe/Dublin\n');
  expect(ran.out).toContain(
    'alert above 2.8 mm/s r.m.s., danger above 7.1 mm/s r.m.s. (overall-fixed-upper)\n',
  );
  expect(ran.out).toMatch(/^2026-03-02 10:00 +4\.4\d? +4\.\d* to 4\.\d* +alert, 57 % over$/m);
  expect(ran.out).toMatch(/^2026-03-02 07:00 +2\.2\d? +2\.\d* to 2\.\d*$/m);
});

test('--since and --until are of the site clock, or a time back; the end is not included', async () => {
  const times = async (...args: string[]) => {
    const ran = await trend('pump-2/de-v', 'overall', '--json', ...args);
    return (JSON.parse(ran.out).levels as { time: string }[]).map(({ time }) => time.slice(11, 13));
  };
  expect(await times('--since', '2026-03-02T07:00', '--until', '2026-03-02T09:00')).toEqual(['07', '08']);
  expect(await times('--since', '2026-03-02T10:00+01:00')).toEqual(['09', '10']);
  expect(await times('--since', '130 min')).toEqual(['09', '10']);
  expect(await times('--until', '2026-03-02')).toEqual([]);
  expect(await trend('pump-2/de-v', 'overall', '--since', 'last week')).toMatchObject({ status: 2 });
  expect(await trend('pump-2/de-v', 'overall', '--since', '1 h', '--until', '2 h')).toMatchObject({
    status: 2,
  });
  expect(await trend('pump-2/de-v', 'overall', '--csv', '--json')).toMatchObject({ status: 2 });
  expect((await trend('pump-2/de-v', 'overall', '--until', '2026-03-02')).out).toContain(
    'no level in this time',
  );
});

test.each([
  ['pump2/de-v', 'overall', "there is no machine 'pump2' in the site file; did you mean 'pump-2'?"],
  ['pump-2/dev', 'overall', "there is no point 'pump-2/dev' in the site file; did you mean 'pump-2/de-v'?"],
  ['pump-2/xyz', 'overall', "there is no point 'pump-2/xyz' in the site file; did you mean 'pump-2/de-v'?"],
  ['pump-2', 'overall', "'pump-2' names no point; there is pump-2/de-v"],
  ['pump-2/de-v', 'overal', "pump-2/de-v has no band 'overal'; did you mean 'overall'?"],
])('%s %s: the nearest known name is said', async (path, band, message) => {
  expect(await trend(path, band)).toEqual({ status: 1, out: '', err: `${message}\n` });
});

describe('after a change of settings', () => {
  test('a band that the ledger does not know yet is said so', async () => {
    const text = readFileSync(site.file, 'utf8');
    writeFileSync(
      site.file,
      text.replace(
        '- id: overall',
        '- id: low\n        from: 10 Hz\n        to: 100 Hz\n      - id: overall',
      ),
    );
    const ran = await trend('pump-2/de-v', 'low');
    expect(ran.status).toBe(1);
    expect(ran.err).toContain('the ledger does not know pump-2/de-v low yet');
    writeFileSync(site.file, text);
  });

  test('the break of the series is marked', async () => {
    const text = readFileSync(site.file, 'utf8');
    writeFileSync(site.file, text.replace('line_spacing: 2.5 Hz', 'line_spacing: 1.25 Hz'));
    expect(await site.service.reload()).toBeNull();
    await site.hour(5);
    const ran = await trend('pump-2/de-v', 'overall');
    expect(ran.out).toContain('--- new series, 10 Hz to 1000 Hz: settings differ');
    const rows = ran.out.split('\n');
    const at = rows.findIndex((row) => row.includes('new series'));
    expect(rows[at - 1]).toContain('2026-03-02 10:00');
    expect(JSON.parse((await trend('pump-2/de-v', 'overall', '--json')).out).series).toHaveLength(2);
  });
});
