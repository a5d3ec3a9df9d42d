/** What a file that is no sound recording gets: waited for, quarantined with its reason, or left alone; said once. */
import { execFileSync } from 'node:child_process';
import {
  appendFileSync,
  linkSync,
  renameSync,
  symlinkSync,
  truncateSync,
  unlinkSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { joined, letters, wavFile } from '../acquisition/wav-writer.ts';
import { beginMs, hourMs, sampleRateHz, signal, stamp, textOf, wav } from '../service/site-on-disk.ts';
import { trial } from '../service/trial.ts';

const minuteMs = 60_000;
const pump = (hour: number) => `pump-2_${stamp(beginMs + hour * hourMs)}.wav`;

describe('a file that is not all there', () => {
  it('is waited for while it grows, and taken when it has ended', async () => {
    const service = await trial();
    const bytes = wav([1]);
    service.drop(pump(0), bytes.subarray(0, 400));
    await service.after(0);
    for (let at = 400; at < bytes.length; at += 400) {
      appendFileSync(join(service.site.drop, pump(0)), bytes.subarray(at, at + 400));
      expect(await service.after(20_000)).toMatchObject({ taken: 0, setAside: 0, waiting: 1 });
    }
    await service.after(4_000);
    expect(await service.outcomes()).toEqual({});
    expect(await service.after(2_000)).toMatchObject({ taken: 1, waiting: 0 });
    expect(await service.outcomes()).toEqual({ [pump(0)]: 'taken' });
  });

  it('is quarantined with the reason when it still grows after incomplete_after', async () => {
    const service = await trial({ recordings: 'incomplete_after: 2 min' });
    for (let n = 0; n < 30; n++) {
      writeFileSync(join(service.site.drop, pump(0)), new Uint8Array(44 + 10 * n));
      await service.after(5_000);
    }
    expect(await service.outcomes()).toEqual({
      [pump(0)]:
        `quarantined: ${pump(0)}: still growing after 2 min; lengthen incomplete_after if the logger writes that long`,
    });
    expect(await service.standing()).toEqual(['unreadable pump-2_<any>.wav trouble']);
  });

  it('is quarantined when its copy was broken off, its size standing still', async () => {
    const service = await trial();
    service.drop(pump(0), wav([1]).subarray(0, 1000));
    await service.take();
    await service.after(9 * minuteMs);
    expect(await service.outcomes()).toEqual({});
    await service.after(minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(
      /^quarantined: .*shorter than its own header says for 10 min \(1000 bytes\); copy it again/,
    );
    expect(service.files('data', 'quarantine')).toEqual([pump(0), `${pump(0)}.reason.txt`]);
    expect(textOf(service.site.data, `quarantine/${pump(0)}.reason.txt`)).toMatch(/^pump-2.*shorter than/);
    expect(service.files('drop')).toEqual([]);
  });

  it('waits when its full size was reserved beforehand: zeros throughout, then a header over zeros', async () => {
    const service = await trial();
    const bytes = wav([signal(1, 1, 8000)]);
    service.drop(pump(0), new Uint8Array(bytes.length));
    await service.take();
    writeFileSync(
      join(service.site.drop, pump(0)),
      joined(bytes.subarray(0, 300), new Uint8Array(bytes.length - 300)),
    );
    await service.after(1000);
    expect(await service.after(6_000)).toMatchObject({ taken: 0, setAside: 0, waiting: 1 });
    writeFileSync(join(service.site.drop, pump(0)), bytes);
    await service.after(1000);
    expect(await service.after(6_000)).toMatchObject({ taken: 1 });
    expect(await service.outcomes()).toEqual({ [pump(0)]: 'taken' });
  });

  it('is read after the wait when a complete header stands over a tail of zeros, and says so', async () => {
    const service = await trial();
    const samples = new Float64Array(4096);
    samples.set(Float64Array.from({ length: 1280 }, (_, n) => Math.sin(n / 3)));
    service.drop(pump(0), wav([samples]));
    await service.take();
    await service.after(10 * minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(/^taken: its tail is all zeros/);
  });

  it('is quarantined when nothing but reserved zeros came', async () => {
    const service = await trial();
    service.drop(pump(0), new Uint8Array(5000));
    await service.take();
    await service.after(10 * minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(/^quarantined/);
  });

  it('is quarantined when it stays empty', async () => {
    const service = await trial();
    service.drop(pump(0), new Uint8Array(0));
    await service.take();
    await service.after(10 * minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(/^quarantined: .*empty for 10 min/);
  });
});

describe('a file that is no recording', () => {
  const damaged: [string, Uint8Array, RegExp][] = [
    ['text', letters('transfer aborted\n'), /not|no/],
    ['random bytes', Uint8Array.from({ length: 3000 }, (_, n) => (n * 7919 + 13) % 251), /not|no/],
    ['a rate of 0', wavFile({ rateHz: 0, data: new Uint8Array(100) }), /rate/],
    ['a rate of 4 GHz', wavFile({ rateHz: 4_294_967_295, data: new Uint8Array(100) }), /rate/],
    ['65,535 channels', wavFile({ channels: 65_535, data: new Uint8Array(100) }), /channel/],
    ['0 channels', wavFile({ channels: 0, data: new Uint8Array(100) }), /channel/],
    ['compressed samples', wavFile({ code: 85, data: new Uint8Array(100) }), /85|compress|format/],
  ];
  it.each(damaged)('is quarantined at once with a reason of one line: %s', async (_, bytes, reason) => {
    const service = await trial();
    service.drop(pump(0), bytes);
    expect(await service.take()).toMatchObject({ taken: 0, setAside: 1, waiting: 0 });
    const outcome = (await service.outcomes())[pump(0)] as string;
    expect(outcome).toMatch(/^quarantined: pump-2_/);
    expect(outcome.slice(`quarantined: ${pump(0)}`.length)).toMatch(reason);
    expect(outcome).not.toContain('\n');
    expect(service.files('drop')).toEqual([]);
    expect(await service.standing()).toEqual(['unreadable pump-2_<any>.wav trouble']);
    service.toHour(1);
    service.drop(pump(1), wav([1]));
    await service.take();
    expect(await service.standing()).toEqual([]);
  });

  it('with a header that claims 4 GB of samples takes no more memory than the file holds', async () => {
    const service = await trial();
    service.drop(
      pump(0),
      wavFile({ rateHz: sampleRateHz, data: new Uint8Array(512).fill(3), dataSize: 4_000_000_000 }),
    );
    await service.take();
    await service.after(10 * minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(/^quarantined: .*shorter than its own header says/);
    expect(process.memoryUsage().rss).toBeLessThan(1e9);
  });

  it('of more than largest_file is not read, stays, and is told once', async () => {
    const service = await trial({ folders: 'largest_file: 1 MB' });
    service.drop(pump(0), wav([1]));
    truncateSync(join(service.site.drop, pump(0)), 2_000_000);
    await service.take();
    await service.hour(1);
    expect(service.said('has 2000000 bytes; more than 1000000 are not read')).toHaveLength(1);
    expect(service.files('drop')).toEqual([pump(0)]);
    expect(await service.journal()).toContain('raised unreadable pump-2_<any>.wav');
  });
});

describe('what is not a regular file of one name', () => {
  it.each([
    ['a pipe', (path: string) => void execFileSync('mkfifo', [path]), 'it is a pipe, not a file'],
    ['a link', (path: string) => symlinkSync('/etc/hostname', path), 'it is a link; links are not followed'],
    [
      'a link to a device',
      (path: string) => symlinkSync('/dev/zero', path),
      'it is a link; links are not followed',
    ],
    ['a link in a circle', (path: string) => symlinkSync(path, path), 'it is a link; links are not followed'],
  ])('%s is left alone, said once, and the service goes on', async (_, make, reason) => {
    const service = await trial();
    make(join(service.site.drop, pump(0)));
    for (const hour of [1, 2, 3]) expect(await service.hour(hour)).toMatchObject({ taken: 2 });
    expect(service.files('drop')).toEqual([pump(0)]);
    expect(service.said(reason)).toHaveLength(1);
  });

  it('a file with a second name is left alone until it has one', async () => {
    const service = await trial();
    const other = join(service.site.folder, 'elsewhere.wav');
    writeFileSync(other, wav([1]));
    linkSync(other, join(service.site.drop, pump(0)));
    await service.hour(1);
    await service.hour(2);
    expect(service.said('has 2 names')).toHaveLength(1);
    expect(Object.keys(await service.outcomes())).not.toContain(pump(0));
    unlinkSync(other);
    await service.take();
    await service.after(minuteMs);
    expect((await service.outcomes())[pump(0)]).toMatch(/^taken/);
  });

  it('a pipe that takes the place of a settling file holds nobody up', async () => {
    const service = await trial();
    service.drop(pump(0), wav([1]));
    await service.after(0);
    unlinkSync(join(service.site.drop, pump(0)));
    execFileSync('mkfifo', [join(service.site.drop, pump(0))]);
    expect(await service.hour(1)).toMatchObject({ taken: 2 });
  });
});

describe('a file that no point takes', () => {
  it('stays, is said and raised once for its kind of name, and is moved after unassigned_after', async () => {
    const service = await trial({ recordings: 'unassigned_after: 2 h' });
    const names = [0, 1, 2].map((n) => `chiller-9_${stamp(beginMs + n)}.wav`);
    for (const name of names) service.drop(name, wav([1]));
    const round = await service.take();
    expect(round.unassigned.map(({ path }) => path)).toEqual([...new Set(names)].sort());
    await service.hour(1);
    expect(service.said('no point of the site file takes this file')).toHaveLength(1);
    expect(await service.standing()).toEqual(['unassigned chiller-#_#T#Z.wav trouble']);
    expect(await service.rows('to_tell', 'event, severity')).toEqual([
      { event: 'raised', severity: 'trouble' },
    ]);
    expect(service.files('drop')).toEqual([...new Set(names)].sort());
    await service.hour(3);
    expect(service.files('drop')).toEqual([]);
    expect(service.files('data', 'unassigned')).toContain(`${names[0]}.reason.txt`);
    expect((await service.outcomes())[names[0] as string]).toMatch(/^unassigned: no point/);
    await service.after(0);
    expect(await service.standing()).toEqual([]);
  });

  it('is no trouble any more once it is renamed to what a point takes', async () => {
    const service = await trial();
    service.drop('PUMP-2_20260302T060000Z.WAV', wav([1]));
    await service.take();
    expect(await service.standing()).toEqual(['unassigned PUMP-#_#T#Z.WAV trouble']);
    renameSync(join(service.site.drop, 'PUMP-2_20260302T060000Z.WAV'), join(service.site.drop, pump(0)));
    await service.take();
    expect(await service.standing()).toEqual([]);
    expect(await service.outcomes()).toEqual({ [pump(0)]: 'taken' });
  });
});

describe('a name that cannot be kept', () => {
  const names: [string, Buffer][] = [
    ['a line break', Buffer.from('pump-2_20260302T060000Z\n.wav')],
    ['not UTF-8', Buffer.from([...Buffer.from('pump-2_'), 0xff, 0xfe, ...Buffer.from('.wav')])],
    ['a mark that turns the direction', Buffer.from('pump-2_\u202evaw.exe')],
    ['an escape sequence', Buffer.from('pump-2_\u001b[31m.wav')],
  ];
  it.each(names)('is quarantined under a made-up name: %s', async (_, name) => {
    const service = await trial();
    writeFileSync(Buffer.concat([Buffer.from(`${service.site.drop}/`), name]), wav([1]));
    expect(await service.take()).toMatchObject({ setAside: 1 });
    const [filed] = service.files('data', 'quarantine');
    expect(filed).toMatch(/^unnamed-[0-9a-f]{8}(\.[a-z]+)?$/);
    expect(textOf(service.site.data, `quarantine/${filed}.reason.txt`)).toMatch(/^[^\p{C}]+\n$/u);
    expect(service.files('drop')).toEqual([]);
    expect(await service.standing()).toEqual(['unreadable files with unusable names trouble']);
    expect(await service.hour(1)).toMatchObject({ taken: 2 });
  });

  it('of 255 bytes is filed under one that leaves room for its reason', async () => {
    const service = await trial();
    const name = `pump-2_${'ä'.repeat(122)}.wav`;
    expect(Buffer.byteLength(name)).toBe(255);
    service.drop(name, 'no recording');
    await service.take();
    expect(service.files('data', 'quarantine')).toHaveLength(2);
    expect(service.files('drop')).toEqual([]);
  });

  it("that looks like the ledger's own spelling of such names is quarantined too", async () => {
    const service = await trial({ pump: 'recordings:\n  files: bytes:<any>' });
    service.drop('bytes:2e2e2f2e2e', wav([1]));
    await service.take();
    expect(service.files('drop')).toEqual([]);
    expect(service.files('data', 'quarantine')).toHaveLength(2);
  });

  it('trouble with unusable names is over a day after the last of them', async () => {
    const service = await trial({ recordings: 'overdue_after: 1000 h' });
    writeFileSync(join(service.site.drop, 'a\tb.wav'), wav([1]));
    await service.take();
    await service.after(23 * hourMs);
    expect(await service.standing()).toHaveLength(1);
    await service.after(2 * hourMs);
    expect(await service.standing()).toEqual([]);
  });
});
