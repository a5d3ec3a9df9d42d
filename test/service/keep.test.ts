/** With `after_reading: keep` the drop folder is the archive: what was read is opened again only when it has changed. */
import { renameSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it, onTestFinished, vi } from 'vitest';
import { sweepFolder } from '../../src/acquisition/sweep.ts';
import { FileAway } from '../../src/service/file-away.ts';
import { manyKept, opened } from './many-kept.ts';
import { beginMs, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { serviceOn, site } from './trial.ts';

const minuteMs = 60_000;
const keep = { folders: 'after_reading: keep', recordings: 'overdue_after: 1000 h' };
const worker = new URL('./counting-worker.ts', import.meta.url);
const pump = (hour: number, ending = 'wav') => `pump-2_${stamp(beginMs + hour * hourMs)}.${ending}`;
const tone = (seed: number) => wav([signal(1, seed, 512)]);
const late = 'late-sidecar pump-2_<any>.wav trouble';

async function quietRounds(service: TrialService, ms: number): Promise<void> {
  for (let n = 0; n < 4; n++)
    expect(await service.after(ms / 4)).toMatchObject({ taken: 0, setAside: 0, waiting: 0 });
}

describe('kept files', () => {
  it('of thousands only those that changed, and new ones, are opened', () => manyKept(5_000, 20), 120_000);

  it('stay with their sidecars, which are no late ones; also after a restart', async () => {
    const on = site(keep);
    const service = await serviceOn(on, { worker });
    service.drop(pump(0), tone(1));
    service.drop(pump(0, 'json'), '{"speed_rpm": 1480}');
    service.clock.advance(10_000);
    expect(await service.take()).toMatchObject({ taken: 1 });
    await quietRounds(service, 30 * minuteMs);
    await service.stop();
    opened(on.folder);
    const again = await serviceOn(on, { worker, clock: service.clock });
    await quietRounds(again, 30 * minuteMs);
    expect(opened(on.folder)).toEqual([]);
    expect(again.files('drop')).toEqual([pump(0, 'json'), pump(0)].sort());
    expect(await again.standing()).toEqual([]);
  });

  it('are not held in memory as files that are to be moved', async () => {
    const know = vi.spyOn(FileAway.prototype, 'know');
    onTestFinished(() => know.mockRestore());
    const service = await serviceOn(site(keep));
    service.drop(pump(0), tone(1));
    service.clock.advance(10_000);
    expect(await service.take()).toMatchObject({ taken: 1 });
    expect(know).not.toHaveBeenCalled();
    const archiving = await serviceOn(site());
    archiving.drop(pump(0), tone(1));
    archiving.clock.advance(10_000);
    expect(await archiving.take()).toMatchObject({ taken: 1 });
    expect(know).toHaveBeenCalledTimes(1);
  });

  it('get no sidecar afterwards: one that comes late or changes is quarantined and told', async () => {
    const on = site(keep);
    const service = await serviceOn(on, { worker });
    service.drop(pump(0), tone(1));
    service.clock.advance(10_000);
    await service.take();
    service.drop(pump(0, 'json'), '{"speed_rpm": 1480}');
    await service.after(0);
    await service.after(10 * minuteMs);
    expect(await service.standing()).toEqual([late]);
    expect(service.files('data', 'quarantine')).toContain(pump(0, 'json'));
    expect(service.files('drop')).toEqual([pump(0)]);
  });

  it('that change are read again, with the sidecar that has been there all along', async () => {
    const on = site(keep);
    const service = await serviceOn(on, { worker });
    service.drop(pump(0), tone(1));
    service.drop(pump(0, 'json'), '{"speed_rpm": 1480}');
    service.clock.advance(10_000);
    await service.take();
    await service.after(40 * minuteMs);
    opened(on.folder);
    writeFileSync(join(on.drop, pump(0)), tone(2));
    await service.take();
    expect(opened(on.folder)).toEqual([`header ${pump(0)}`, `measure ${pump(0)}`]);
    expect(await service.rows('measurements', 'speed_rpm')).toEqual([
      { speed_rpm: 1480 },
      { speed_rpm: 1480 },
    ]);
    expect(await service.standing()).not.toContain(late);
  });

  it('that are gone for a day are forgotten; for an hour, as with a share that was away, they are not', async () => {
    const on = site(keep);
    const service = await serviceOn(on, { worker });
    service.drop(pump(0), tone(1));
    service.drop(pump(1), tone(2));
    service.clock.advance(hourMs);
    expect(await service.take()).toMatchObject({ taken: 2 });
    opened(on.folder);
    renameSync(join(on.drop, pump(0)), join(on.folder, 'away'));
    rmSync(join(on.drop, pump(1)));
    await service.after(hourMs);
    renameSync(join(on.folder, 'away'), join(on.drop, pump(0)));
    await service.take();
    await service.after(61_000);
    await quietRounds(service, hourMs);
    // A rename changes the time of change of the file's entry: it is looked into, and found to be a repeat.
    expect(opened(on.folder).length).toBeLessThanOrEqual(2);
    for (let n = 0; n < 27; n++) await service.after(hourMs);
    expect(await service.rows('seen_files', 'path')).toEqual([{ path: pump(0) }]);
  });

  it('do not count for the bound of a sweep: they hide no new one, and a crowd of others is cut', async () => {
    const on = site(keep);
    for (const name of ['a', 'b', 'c', 'd', 'e']) writeFileSync(join(on.drop, name), name);
    const isKnown = ({ path }: { readonly path: string }) => path < 'e';
    const few = { mostFiles: 2, deepest: 1 };
    const sweep = await sweepFolder(on.drop, [], few, isKnown);
    expect(sweep).toMatchObject({ cut: false, files: { length: 5 } });
    for (let n = 0; n < 100; n++) writeFileSync(join(on.drop, `x${100 + n}`), 'new');
    expect(await sweepFolder(on.drop, [], few, isKnown)).toMatchObject({ cut: true });
  });
});
