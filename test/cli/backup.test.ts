import { readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, test } from 'vitest';
import { run, smallSite } from './small-site.ts';

test('a backup is made beside the running service, checked, never over another file, and the summary knows it', async () => {
  const site = await smallSite();
  try {
    await site.hour(0);
    const at = { workingFolder: site.folder, clock: site.clock };
    const before = await run(['summary', '--text'], at);
    expect(before.out.replace(/\s+/g, ' ')).toContain('no backup yet');
    const ran = await run(['backup', 'copy.sqlite'], at);
    expect(ran).toMatchObject({ status: 0, err: '' });
    expect(ran.out).toMatch(/copy\.sqlite: \d+ bytes, checked\n$/);
    const copy = new Database(join(site.folder, 'copy.sqlite'), { readonly: true });
    expect(copy.prepare("select count(*) from recordings where outcome = 'taken'").pluck().get()).toBe(2);
    copy.close();
    expect((await run(['summary', '--text'], at)).out.replace(/\s+/g, ' ')).toContain(
      'last backup Mon 2 Mar 2026, 06:00',
    );
    for (const name of ['old.sqlite.part', 'empty.part', 'letter.part'])
      writeFileSync(
        join(site.folder, name),
        name.startsWith('old')
          ? readFileSync(join(site.folder, 'copy.sqlite')).subarray(0, 9000)
          : name.startsWith('letter')
            ? 'Dear'
            : '',
      );
    const second = await run(['backup', 'second.sqlite'], at);
    expect(second.status).toBe(0);
    expect(second.err.split('\n').map((line) => line.slice(0, 45))).toEqual([
      'note: empty.part beside it is no backup: one ',
      'note: old.sqlite.part beside it is no backup:',
      '',
    ]);
    for (const name of ['old.sqlite.part', 'empty.part', 'letter.part']) rmSync(join(site.folder, name));
    const again = await run(['backup', 'copy.sqlite'], at);
    expect(again.status).toBe(1);
    expect(again.err).toContain('is there already; a backup never overwrites');
    expect(await run(['backup', 'nowhere/copy.sqlite'], at)).toMatchObject({ status: 1 });
    expect(readdirSync(site.folder).filter((name) => name.endsWith('.part'))).toEqual([]);
  } finally {
    await site.remove();
  }
}, 60_000);
