/** A logger that was cut off sends days at once, in any order: the same story as live, told in few mails. */
import { describe, expect, it } from 'vitest';
import { SteppedClock } from '../../src/service/clock.ts';
import { sameAsLive } from './backlog-play.ts';
import { MailServerOnLoopback } from './mail-server.ts';
import { beginMs, hourMs, signal, stamp, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const minuteMs = 60_000;
const ann = 'maintenance@trial.example';

describe('a backlog', () => {
  it(
    'in random order gives the same levels, alarms and journal as live',
    () => sameAsLive(3, 20261201),
    180_000,
  );

  it('mails at once what still stands, and in one catch-up mail what came and went', async () => {
    const server = await MailServerOnLoopback.start();
    const clock = new SteppedClock(beginMs + 41 * hourMs + 10_000);
    const service = await trial({ mailPort: server.port, recordings: 'overdue_after: 1000 h' }, { clock });
    await service.service.mailRound(true);
    server.got.splice(0);
    for (let hour = 40; hour >= 0; hour--) {
      const [press, pump] = [hour > 5 && hour < 10 ? 5 : 1, hour > 30 || (hour > 12 && hour < 16) ? 5 : 1];
      const tone = (level: number, seed: number) => signal(level, seed, 512);
      const at = stamp(beginMs + hour * hourMs);
      service.drop(`press-1_${at}.wav`, wav([tone(press, hour), tone(1, 100 + hour)]));
      service.drop(`pump-2_${at}.wav`, wav([tone(pump, 200 + hour)]));
    }
    await service.take();
    await service.service.mailRound();
    expect(server.got).toEqual([]);
    await service.after(61_000);
    expect(service.files('drop')).toEqual([]);
    for (let n = 0; n < 8; n++) {
      await service.after(minuteMs);
      await service.service.mailRound();
    }
    const subjects = server.to(ann).map(({ subject }) => subject ?? '');
    expect(subjects.filter((subject) => subject.startsWith('ALERT'))).toEqual([
      expect.stringContaining('Pump 2'),
    ]);
    const others = server.to(ann).filter(({ subject }) => !subject?.startsWith('ALERT'));
    expect(others).toHaveLength(1);
    expect(others[0]?.text).toContain('Press 1');
    // The pump's earlier hours belong to the alarm that stands: it was never acknowledged.
    expect(others[0]?.text).not.toContain('Pump 2');
    const told = await service.rows('to_tell', 'distinct number, from_backlog', 'order by number');
    expect(told).toEqual([
      { number: 1, from_backlog: 1 },
      { number: 2, from_backlog: 1 },
    ]);
    expect(await service.rows('to_tell', 'count(*) as n', 'where message_id is null')).toEqual([{ n: 0 }]);
  });

  it('is held until it is quiet, but never longer than a quarter of an hour', async () => {
    const service = await trial(
      { recordings: 'overdue_after: 1000 h' },
      { clock: new SteppedClock(beginMs + 100 * hourMs) },
    );
    for (let n = 0; n < 40; n++) {
      service.drop(`pump-2_${stamp(beginMs + n * hourMs)}.wav`, wav([signal(1, n + 1, 512)]));
      const { taken } = await service.after(30_000);
      if (n < 29) expect(taken, `after ${n / 2} min`).toBe(0);
    }
    await service.after(30_000);
    await service.after(minuteMs);
    expect(await service.rows('recordings', 'sum(evaluated) as n')).toEqual([{ n: 40 }]);
  });
});
