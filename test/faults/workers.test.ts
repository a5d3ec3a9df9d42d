/** A worker that crashes, hangs or runs out of memory over one file: tried again alone, quarantined, the service lives. */
import { unlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { beginMs, hourMs, siteText, stamp, TrialService, wav } from '../service/site-on-disk.ts';
import { serviceOn, site, trial } from '../service/trial.ts';

const worker = new URL('./poison-worker.ts', import.meta.url);
const pump = (hour: number, more: string) => `pump-2_${stamp(beginMs + hour * hourMs)}${more}.wav`;

describe('a file over which a worker', () => {
  it.each([
    ['crashes', '-crash', /exited with code: 7.*tried again alone/],
    ['throws', '-throw', /thrown over this file; tried again alone: thrown over this file/],
    ['throws late, outside its task', '-late', /thrown late.*tried again alone/],
    ['hangs', '-hang', /did not end within 0.8 s; tried again alone/],
    ['crashes while it reads the header', '-header-crash', /reading its header stopped a worker.*code: 7/],
  ])('%s is quarantined with the reason, and the others are taken', async (_, more, reason) => {
    const service = await trial({}, { worker, deadlineMs: 800 });
    service.drop(pump(0, more), wav([1]));
    service.dropHour(0);
    service.clock.advance(10_000);
    expect(await service.take()).toMatchObject({ taken: 3 - Number(more.includes('header')) });
    const outcomes = await service.outcomes();
    expect(outcomes[pump(0, more)]).toMatch(/^quarantined: /);
    expect(outcomes[pump(0, more)]).toMatch(reason);
    expect(outcomes[pump(0, '')]).toBe('taken');
    expect(service.files('drop')).toEqual([]);
    expect(await service.rows('attempts', '*')).toEqual([]);
    expect(await service.hour(1)).toMatchObject({ taken: 2 });
  });

  it('breaks after it has answered is no file that is to blame: all are taken', async () => {
    const service = await trial({}, { worker, deadlineMs: 5_000 });
    service.drop(pump(0, '-after'), wav([2]));
    for (const hour of [0, 1, 2]) {
      service.toHour(hour);
      service.dropHour(hour);
      await service.take();
    }
    await service.after(60_000);
    const outcomes = Object.values(await service.outcomes());
    expect(outcomes).toHaveLength(7);
    expect(outcomes.filter((outcome) => !outcome.startsWith('taken'))).toEqual([]);
    expect(service.files('drop')).toEqual([]);
    expect(await service.rows('attempts', '*')).toEqual([]);
  });

  it('fills its memory is quarantined, and the others are taken', async () => {
    const service = await trial({}, { worker });
    service.drop(pump(0, '-fill'), wav([1]));
    await service.take();
    expect((await service.outcomes())[pump(0, '-fill')]).toMatch(/^quarantined: .*memory/);
    expect(await service.hour(1)).toMatchObject({ taken: 2 });
  }, 60_000);
});

describe('a file that stops the service itself', () => {
  it('is read alone at the next start, and quarantined at the one after that', async () => {
    const on = site();
    const names: string[] = [];
    for (const run of [1, 2, 3]) {
      const service = await TrialService.start(on, {
        step: (name) => {
          // What stands in the ledger when the process ends over this file, and nothing that comes later.
          if (name === 'intake: recording read' && run < 3) throw new Error('the process ends here');
        },
      });
      if (run === 1) service.drop(pump(0, ''), wav([1]));
      if (run < 3) {
        await expect(service.take()).rejects.toThrow('the process ends here');
        // The end of a process that is killed: nothing is put in order, the kernel gives the owner's lock back.
        await service.service.ledger.close();
      } else {
        await service.take();
        names.push((await service.outcomes())[pump(0, '')] as string);
        await service.stop();
      }
    }
    expect(names).toEqual([`quarantined: ${pump(0, '')}: stopped the service twice while it was read`]);
  });
});

describe('a new site file', () => {
  it('that comes into force while recordings are analysed changes no decision half way', async () => {
    const on = site();
    let reload: Promise<string | null> | null = null;
    const service = await serviceOn(on, {
      step: (name) => {
        if (name === 'intake: attempt noted') reload ??= service.service.reload();
      },
    });
    service.dropHour(0);
    await service.after(10_000);
    const text = siteText();
    writeFileSync(join(on.folder, 'site.yaml'), text.slice(0, text.indexOf('  - id: pump-2')));
    await service.after(6_000);
    expect(await reload).toBeNull();
    await service.take();
    await service.after(6_000);
    expect(await service.outcomes()).toEqual({ [`press-1_${stamp(beginMs)}.wav`]: 'taken' });
    expect(service.files('drop')).toEqual([pump(0, '')]);
    unlinkSync(join(on.drop, pump(0, '')));
  });
});
