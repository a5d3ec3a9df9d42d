/** What makes a recording one: content, sidecar, source, stated start; and what a file is that comes again. */
import { mkdirSync, readFileSync, renameSync, utimesSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { otherFileSystem } from '../faults/story-run.ts';
import { beginMs, frames, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { serviceOn, site, trial } from './trial.ts';

const minuteMs = 60_000;
const patient = { recordings: 'overdue_after: 100 h' };
const short = 512;
const tone = (level: number, seed = 1) => wav([signal(level, seed, short)]);
const pump = (hour: number, more = '') => `pump-2_${stamp(beginMs + hour * hourMs)}${more}.wav`;
const alarm = 'overall-fixed-upper pump-2/de-v';

const taken = (service: TrialService) =>
  service.rows('recordings', 'file_name, outcome, evaluated, reason', 'order by id');

function dropAt(service: TrialService, name: string, bytes: Uint8Array, ms: number): void {
  service.drop(name, bytes);
  utimesSync(join(service.site.drop, name), new Date(ms), new Date(ms));
}

describe('equal files', () => {
  it('every hour, with their starts, are recordings: the point is dead, and never overdue', async () => {
    const service = await trial();
    const dead = wav([new Float64Array(frames).fill(0.25)]);
    for (let hour = 0; hour < 6; hour++) {
      service.toHour(hour);
      service.drop(pump(hour), dead);
      await service.take();
      await service.after(30 * minuteMs);
    }
    const mine = (await service.standing()).filter((line) => line.includes('pump-2'));
    expect(mine).toEqual(['dead-sensor pump-2/de-v trouble']);
    expect((await service.journal()).filter((line) => line === 'raised overdue pump-2/de-v')).toEqual([]);
    expect(await service.rows('levels', 'count(*) as n')).toEqual([{ n: 6 }]);
  });

  it('of two points at one time are two recordings, one a point', async () => {
    const own = 'recordings:\n  files: <machine>_<point>_<any>.wav';
    const service = await trial({ ...patient, press: own, pump: own });
    const same = tone(5);
    for (const hour of [0, 1]) {
      service.toHour(hour);
      const at = stamp(beginMs + hour * hourMs);
      service.drop(`press-1_de-h_${at}.wav`, same);
      service.drop(`pump-2_de-v_${at}.wav`, same);
      await service.take();
    }
    expect((await taken(service)).map(({ outcome, evaluated }) => `${outcome} ${evaluated}`)).toEqual(
      Array(4).fill('taken 1'),
    );
    expect(await service.standing()).toEqual([
      'overall-fixed-upper press-1/de-h alert',
      'overall-fixed-upper pump-2/de-v alert',
    ]);
  });

  it('of two loggers without a stated start repeat only what their own logger sent before', async () => {
    const service = await trial(patient);
    const same = wav([signal(1, 1, short), signal(1, 1, short)]);
    for (let n = 0; n < 3; n++) {
      service.toHour(n);
      const at = service.clock.wallMs();
      dropAt(service, `pump-2_${'abc'[n]}.wav`, same, at);
      dropAt(service, `press-1_${'abc'[n]}.wav`, same, at);
      await service.take();
    }
    expect(await service.standing()).toEqual([
      'repeats-itself press-1_<any>.wav trouble',
      'repeats-itself pump-2_<any>.wav trouble',
    ]);
    expect((await taken(service)).map(({ evaluated }) => evaluated)).toEqual([1, 1, 0, 0, 0, 0]);
    const flagged = await service.rows('recordings', 'quality', 'order by id');
    expect(flagged.map(({ quality }) => String(quality).includes('repeated-content'))).toEqual([
      false,
      false,
      true,
      true,
      true,
      true,
    ]);
  });

  it('under one name and time of change, without a stated start, are one recording', async () => {
    const service = await trial(patient);
    for (let n = 0; n < 2; n++) {
      dropAt(service, 'pump-2_a.wav', tone(1), beginMs);
      await service.take();
    }
    expect((await taken(service)).map(({ outcome }) => outcome)).toEqual(['taken', 'repeat']);
  });
});

describe('a second version under the same name', () => {
  /** The logger reserved the file and was cut off: its second half is zeros. */
  const reserved = () => wav([signal(1, 3, 4000).fill(0, 1500)]);

  it('of a recording whose tail was missing is evaluated, in the place of the first', async () => {
    const service = await trial(patient);
    await service.hour(-1, { pump: 5 });
    service.toHour(0);
    service.drop(pump(0), reserved());
    await service.after(0);
    await service.after(10 * minuteMs);
    expect((await taken(service)).at(-1)).toMatchObject({ file_name: pump(0), evaluated: 1 });
    service.drop(pump(0), wav([signal(5, 3, 4000)]));
    await service.take();
    expect((await taken(service)).at(-1)).toMatchObject({
      file_name: pump(0),
      outcome: 'taken',
      evaluated: 1,
    });
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    const levels = await service.rows(
      'levels',
      'used_ms, round(level) as level',
      `where point_id = 3 and in_trend = 1 and used_ms >= ${beginMs}`,
    );
    expect(levels).toContainEqual({ used_ms: beginMs, level: 5 });
  });

  it('of an old incomplete one takes no state back, and its exceedance is told as late', async () => {
    const service = await trial({ ...patient, pump: 'recordings:\n  expected_every: 2 h' });
    service.drop(pump(0), reserved());
    service.clock.advance(10_000);
    await service.after(0);
    await service.after(10 * minuteMs);
    service.drop(pump(0.5), tone(1, 7));
    service.clock.advance(21 * minuteMs);
    await service.take();
    service.drop(pump(0), wav([signal(9, 3, 4000)]));
    await service.take();
    expect((await taken(service)).map(({ evaluated }) => evaluated)).toEqual([1, 1, 0]);
    expect(await service.standing()).toEqual([]);
    expect(await service.journal()).toContain('exceeded-came-late');
  });

  it('is another recording when it comes later than half an interval', async () => {
    const service = await trial(patient);
    service.clock.advance(10_000);
    service.drop(pump(0), tone(1, 1));
    await service.take();
    await service.after(31 * minuteMs);
    service.drop(pump(0), tone(1, 2));
    await service.take();
    const [first, second] = await service.rows('recordings', 'used_ms, evaluated', 'order by id');
    expect(second).toMatchObject({ evaluated: 1 });
    expect(second?.used_ms as number).toBeGreaterThan(first?.used_ms as number);
    expect(await service.standing()).toEqual(['clock pump-2_<any>.wav trouble']);
  });
});

describe('a file that was set aside', () => {
  it('because no point took it is tried again when it comes again, each time', async () => {
    const service = await trial(patient);
    for (const n of [1, 2]) {
      service.drop('chiller-9_a.wav', tone(1));
      await service.take();
      await service.after(7 * 24 * hourMs + minuteMs);
      expect(service.files('drop')).toEqual([]);
      expect((await taken(service)).map(({ outcome }) => outcome)).toEqual(Array(n).fill('unassigned'));
    }
    // Nothing of it counts as taken: the same content under a name that fits is a recording.
    service.drop(pump(0), tone(1));
    await service.take();
    await service.after(2 * minuteMs);
    expect((await taken(service)).at(-1)).toMatchObject({ file_name: pump(0), outcome: 'taken' });
  });
});

describe('a place in the archive', () => {
  const where = otherFileSystem === null ? [null] : [null, otherFileSystem];
  it.each(where)(
    'that somebody took is left to him, on the same and on another file system (%s)',
    async (shelf) => {
      const on =
        shelf === null ? site(patient) : site(patient, join(shelf, `humledger-identity-${process.pid}`));
      const service = await serviceOn(on);
      const place = join(on.data, 'archive/2026/03/02', pump(0));
      mkdirSync(dirname(place), { recursive: true });
      writeFileSync(place, 'not ours');
      const bytes = tone(1);
      service.clock.advance(10_000);
      service.drop(pump(0), bytes);
      await service.take();
      expect(readFileSync(place, 'utf8')).toBe('not ours');
      const [row] = await service.rows('recordings', 'filing_to, filing_state');
      expect(row).toMatchObject({ filing_state: 'filed' });
      expect(row?.filing_to).toMatch(/\.wav~[0-9a-f]{8}$/);
      expect(readFileSync(join(on.data, String(row?.filing_to)))).toEqual(Buffer.from(bytes));
      expect(service.files('drop')).toEqual([]);
    },
  );

  it('is not lost to a file that comes under the name while the first is copied across file systems', async () => {
    if (otherFileSystem === null) return;
    const on = site(patient, join(otherFileSystem, `humledger-copy-${process.pid}`));
    const second = tone(1.2, 2);
    let replaced = false;
    const service = await serviceOn(on, {
      step: (name) => {
        if (name !== 'filing: copied' || replaced) return;
        replaced = true;
        writeFileSync(join(on.folder, 'next.wav'), second);
        renameSync(join(on.folder, 'next.wav'), join(on.drop, pump(0)));
      },
    });
    const first = tone(1, 1);
    service.clock.advance(10_000);
    service.drop(pump(0), first);
    await service.take();
    await service.take();
    const archived = service.files('data', 'archive/2026/03/02');
    expect(archived).toEqual([pump(0), expect.stringMatching(/~[0-9a-f]{8}$/)]);
    const contents = archived.map((name) => readFileSync(join(on.data, 'archive/2026/03/02', name)));
    expect(contents).toEqual([Buffer.from(first), Buffer.from(second)]);
  });
});
