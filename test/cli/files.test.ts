import {
  existsSync,
  mkdirSync,
  readdirSync,
  readFileSync,
  rmSync,
  symlinkSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, test } from 'vitest';
import { livedInSite, run, type SmallSite, sines, siteText } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await livedInSite();
}, 60_000);
afterAll(() => site.remove());

const cut = 'pump-2_20260302T104000Z.wav';
const files = (...args: string[]) =>
  run(['files', '--site', site.file, ...args], { clock: site.clock, workingFolder: site.folder });
const inData = (...parts: string[]) => join(site.folder, 'data', ...parts);
const inDrop = (...parts: string[]) => join(site.folder, 'drop', ...parts);

test('lists what nobody takes with the nearest pattern, and what could not be used with its reason', async () => {
  writeFileSync(inDrop('pump2_20260302T104000Z.wav'), sines([3], 1));
  const ran = await files('--json');
  expect(ran).toMatchObject({ status: 0, err: '' });
  const answer = JSON.parse(ran.out);
  expect(answer.drop_folder.state).toBe('read');
  expect(answer.drop_folder.files).toMatchObject([
    { file: 'pump2_20260302T104000Z.wav', nearest_pattern: 'pump-2_<any>.wav', differs_at: 5 },
    { file: 'visitor.wav', points: [], ignored: false, nearest_pattern: null, differs_at: null },
  ]);
  expect(answer.unassigned).toEqual([]);
  expect(answer.quarantine).toMatchObject([{ file: cut, size_bytes: 5000, points: ['pump-2/de-v'] }]);
  expect(answer.quarantine[0].reason).toMatch(/^shorter than its own header/);
  const { out } = await files();
  expect(out).toContain('no point takes it; nearest pattern pump-2_<any>.wav');
  expect(out).toContain('no point takes it; no pattern of the site file is near this name');
  rmSync(inDrop('pump2_20260302T104000Z.wav'));
  expect(out.split(cut)).toHaveLength(2);
  expect(out).toContain('taken by pump-2/de-v');
  expect(
    Math.max(
      ...out
        .split('\n')
        .filter((line) => !line.includes(site.folder))
        .map((line) => line.length),
    ),
  ).toBeLessThanOrEqual(80);
});

test('a missing drop folder is said, exit status 1', async () => {
  const text = siteText.replace('drop: ./drop', 'drop: ./nowhere');
  writeFileSync(join(site.folder, 'other.yaml'), text);
  const ran = await run(['files', '--site', join(site.folder, 'other.yaml')]);
  expect(ran.status).toBe(1);
  expect(ran.err).toContain('there is no drop folder');
});

test.each([
  ['../../etc/passwd'],
  ['/etc/passwd'],
  ['quarantine/../ledger.sqlite'],
  ['quarantine/../../site.yaml'],
  ['archive/2026/03/02/pump-2_20260302T060000Z.wav'],
  ['quarantine'],
  ['quarantine/'],
  [`quarantine/${cut}.reason.txt`],
  ['quarantine/link.wav'],
  ['quarantine/folder-link/site.yaml'],
  [''],
])('only files of quarantine and unassigned are taken again, not %j', async (name) => {
  if (!existsSync(inData('quarantine', 'link.wav'))) {
    symlinkSync(site.file, inData('quarantine', 'link.wav'));
    symlinkSync(site.folder, inData('quarantine', 'folder-link'));
  }
  const before = readdirSync(inDrop());
  const ran = await files('--take-again', name);
  expect(ran.status).toBe(1);
  expect(ran.err).toContain('is no file in quarantine or unassigned');
  expect(readdirSync(inDrop())).toEqual(before);
  rmSync(inData('quarantine', 'link.wav'));
  rmSync(inData('quarantine', 'folder-link'));
});

test('nothing in the drop folder is overwritten', async () => {
  writeFileSync(inDrop(cut), 'a new arrival');
  const ran = await files('--take-again', cut);
  expect(ran.status).toBe(1);
  expect(ran.err).toContain('is there already; nothing is overwritten');
  expect(readFileSync(inDrop(cut), 'utf8')).toBe('a new arrival');
  expect(existsSync(inData('quarantine', cut))).toBe(true);
  rmSync(inDrop(cut));
});

test('a file that was mended in quarantine is taken again: the service takes it as a new arrival', async () => {
  const levels = async () => {
    const ran = await run(['trend', 'pump-2/de-v', 'overall', '--json', '--site', site.file]);
    return JSON.parse(ran.out).levels as { time: string; level: number }[];
  };
  expect((await levels()).map(({ time }) => time)).not.toContain('2026-03-02T10:40:00.000Z');
  writeFileSync(inData('quarantine', cut), sines([4], 9));
  const ran = await files('--take-again', `quarantine/${cut}`);
  expect(ran).toEqual({ status: 0, out: `in the drop folder again: ${cut}\n`, err: '' });
  expect(readdirSync(inData('quarantine'))).toEqual([]);
  await site.rounds(1_000, 8_000, 90_000);
  expect((await levels()).at(-1)).toMatchObject({
    time: '2026-03-02T10:40:00.000Z',
    level: expect.closeTo(4, 1),
  });
});

test('an unassigned file stays where it is until a pattern takes it; then it goes to the folder it came from, its sidecar first', async () => {
  mkdirSync(inData('unassigned'), { recursive: true });
  writeFileSync(inData('unassigned', 'visitor_1.wav'), sines([3], 1));
  writeFileSync(inData('unassigned', 'visitor_1.wav.reason.txt'), 'no point takes it\n');
  writeFileSync(inData('unassigned', 'visitor_1.json'), '{"speed_rpm": 1480}');
  const refused = await files('--take-again', 'visitor_1.wav');
  expect(refused.status).toBe(1);
  expect(refused.err).toContain('no point takes visitor_1.wav, so it stays where it is; no pattern');
  writeFileSync(
    site.file,
    `${siteText.replace('Raw water pump 2', 'Raw water pump 2\n    recordings:\n      files: visitor_<any>.wav')}`,
  );
  const listed = JSON.parse((await files('--json')).out);
  expect(listed.unassigned).toMatchObject([{ file: 'visitor_1.wav', reason: 'no point takes it' }]);
  const ran = await files('--take-again', 'visitor_1.wav');
  writeFileSync(site.file, siteText);
  expect(ran).toMatchObject({ status: 0, out: 'in the drop folder again: visitor_1.json, visitor_1.wav\n' });
  expect(readdirSync(inDrop())).toEqual(expect.arrayContaining(['visitor_1.json', 'visitor_1.wav']));
  expect(readdirSync(inData('unassigned'))).toEqual([]);
});
