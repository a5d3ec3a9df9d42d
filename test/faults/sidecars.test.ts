/** Sidecars early, late, missing, hostile, shared: a recording is taken whatever stands beside it. */
import { symlinkSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { beginMs, hourMs, stamp, wav } from '../service/site-on-disk.ts';
import { trial } from '../service/trial.ts';

const minuteMs = 60_000;
const name = (hour: number, ending: string) => `pump-2_${stamp(beginMs + hour * hourMs)}.${ending}`;

describe('a sidecar', () => {
  it('may come before its recording; both are filed under one name', async () => {
    const service = await trial();
    service.drop(name(0, 'json'), '{"speed_rpm": 1480, "load_percent": 70}');
    await service.take();
    await service.after(5 * minuteMs);
    service.drop(name(0, 'wav'), wav([1]));
    await service.take();
    expect(await service.outcomes()).toEqual({ [name(0, 'wav')]: 'taken' });
    expect(service.files('data', 'archive')).toEqual([
      `2026/03/02/${name(0, 'json')}`,
      `2026/03/02/${name(0, 'wav')}`,
    ]);
    expect(await service.rows('measurements', 'speed_rpm, load_percent')).toEqual([
      { speed_rpm: 1480, load_percent: 70 },
    ]);
  });

  it('that is expected is waited for, and its recording is taken without it when it never comes', async () => {
    const service = await trial({ pump: 'recordings:\n  sidecar: expected' });
    service.drop(name(0, 'wav'), wav([1]));
    expect(await service.take()).toMatchObject({ taken: 0, waiting: 1 });
    await service.after(9 * minuteMs);
    expect(await service.outcomes()).toEqual({});
    await service.after(minuteMs);
    expect(await service.outcomes()).toEqual({ [name(0, 'wav')]: 'taken' });
  });

  it('that comes after its recording was read is quarantined and told; one in time ends that trouble', async () => {
    const service = await trial();
    service.drop(name(0, 'wav'), wav([1]));
    await service.take();
    service.drop(name(0, 'json'), '{"speed_rpm": 1480}');
    await service.after(0);
    await service.after(10 * minuteMs);
    expect(service.files('data', 'quarantine')).toEqual([name(0, 'json'), `${name(0, 'json')}.reason.txt`]);
    expect(await service.standing()).toEqual(['late-sidecar pump-2_<any>.wav trouble']);
    service.toHour(1);
    service.drop(name(1, 'wav'), wav([1]));
    service.drop(name(1, 'json'), '{"speed_rpm": 1480}');
    await service.take();
    expect(await service.standing()).toEqual([]);
  });

  it('that changes while its recording settles begins the wait anew', async () => {
    const service = await trial();
    service.drop(name(0, 'wav'), wav([1]));
    service.drop(name(0, 'json'), '{"speed_');
    await service.after(0);
    await service.after(4_000);
    writeFileSync(join(service.site.drop, name(0, 'json')), '{"speed_rpm": 1480}');
    expect(await service.after(4_000)).toMatchObject({ taken: 0 });
    expect(await service.after(5_000)).toMatchObject({ taken: 1 });
    expect(await service.rows('measurements', 'speed_rpm')).toEqual([{ speed_rpm: 1480 }]);
  });

  const hostile: [string, string][] = [
    ['no JSON', '{"speed_rpm": 14'],
    ['nested without end', '['.repeat(60_000)],
    ['a key of the prototype', '{"__proto__": {"speed_rpm": 5}}'],
    ['an unknown key', '{"speed": 1480}'],
    ['a number beyond all numbers', '{"speed_rpm": 1e999}'],
    ['a speed as text', '{"speed_rpm": "1480; drop table recordings"}'],
    ['more than 64 kB', `{"start": "${'x'.repeat(70_000)}"}`],
    ['nothing', ''],
    ['a list', '[1, 2, 3]'],
  ];
  it.each(hostile)(
    'that holds %s costs its recording nothing and is quarantined with the reason',
    async (_, text) => {
      const service = await trial();
      service.drop(name(0, 'wav'), wav([1]));
      service.drop(name(0, 'json'), text);
      await service.take();
      const outcomes = await service.outcomes();
      expect(outcomes[name(0, 'wav')]).toMatch(/^taken: sidecar/);
      expect(outcomes[name(0, 'json')]).toMatch(/^quarantined: pump-2_.*json: sidecar/);
      expect(service.files('drop')).toEqual([]);
      expect(await service.rows('levels', 'count(*) as n')).toEqual([{ n: 1 }]);
    },
  );

  it('that is a link is not followed', async () => {
    const service = await trial();
    symlinkSync('/etc/passwd', join(service.site.drop, name(0, 'json')));
    service.drop(name(0, 'wav'), wav([1]));
    await service.take();
    expect(await service.outcomes()).toEqual({ [name(0, 'wav')]: 'taken' });
    expect(service.files('drop')).toEqual([name(0, 'json')]);
  });

  it('of a corrupt recording goes to quarantine with it', async () => {
    const service = await trial();
    service.drop(name(0, 'wav'), 'transfer aborted');
    service.drop(name(0, 'json'), '{"speed_rpm": 1480}');
    await service.take();
    expect(service.files('data', 'quarantine')).toEqual([
      name(0, 'json'),
      name(0, 'wav'),
      `${name(0, 'wav')}.reason.txt`,
    ]);
    expect(service.files('drop')).toEqual([]);
  });
});
