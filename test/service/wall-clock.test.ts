/** Somebody sets the clock of the machine that the service runs on, while it runs. Nothing is lost or told twice. */
import { describe, expect, it } from 'vitest';
import { localDate } from '../../src/config/local-time.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { MailServerOnLoopback } from './mail-server.ts';
import { beginMs, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { serviceOn, site, trial } from './trial.ts';

const minuteMs = 60_000;
const dayMs = 24 * hourMs;
const alarm = 'overall-fixed-upper pump-2/de-v';

/** A site whose loggers go right, whatever the service's own clock shows. */
class Works {
  readonly service: TrialService;
  /** Hours that have truly passed. */
  #hour = 0;
  #seed = 1;

  constructor(service: TrialService) {
    this.service = service;
  }

  /** The next hour: both loggers send, and the service looks every ten minutes. */
  async hour(pump = 1): Promise<void> {
    const trueMs = beginMs + this.#hour * hourMs;
    this.service.drop(`press-1_${stamp(trueMs)}.wav`, this.#wav(1, 1));
    this.service.drop(`pump-2_${stamp(trueMs)}.wav`, this.#wav(pump));
    this.#hour++;
    await this.service.take();
    await this.pass(hourMs - 6_000);
  }

  async pass(ms: number): Promise<void> {
    for (let passedMs = 0; passedMs < ms; passedMs += 10 * minuteMs) {
      await this.service.after(Math.min(10 * minuteMs, ms - passedMs));
      await this.service.service.morning();
    }
  }

  /** Somebody sets the clock; the service goes on at its next round. */
  async set(byMs: number): Promise<void> {
    const { clock } = this.service;
    clock.setWall(clock.wallMs() + byMs);
    await this.pass(10 * minuteMs);
    this.service.clock.advance(0);
  }

  #wav(...levels: number[]): Uint8Array {
    return wav(levels.map((level) => signal(level, this.#seed++, 512)));
  }

  async everyFileOnce(): Promise<void> {
    const rows = await this.service.rows('recordings', 'outcome, count(*) as n', 'group by outcome');
    expect(rows).toEqual([{ outcome: 'taken', n: 2 * this.#hour }]);
    expect(this.service.files('drop')).toEqual([]);
  }

  async overdueEver(): Promise<string[]> {
    return (await this.service.journal()).filter((line) => line.startsWith('raised overdue'));
  }
}

const steps: readonly [string, number][] = [
  ['forward by an hour', hourMs],
  ['forward by a day', dayMs],
  ['back by an hour', -hourMs],
  ['back by a day', -dayMs],
];

describe('the clock of the service', () => {
  it.each(steps)('set %s: every file once, nobody overdue, the alarm raised once', async (_, byMs) => {
    const service = await trial();
    const works = new Works(service);
    for (let n = 0; n < 3; n++) await works.hour();
    await works.set(byMs);
    for (let n = 0; n < 4; n++) await works.hour(5);
    await works.everyFileOnce();
    expect(await works.overdueEver()).toEqual([]);
    const journal = await service.journal();
    expect(journal.filter((line) => line === `raised ${alarm}`)).toHaveLength(1);
    expect(await service.standing()).toContain(`${alarm} alert`);
    // The loggers' clocks are right, and so they look ahead of a service that was set back.
    const clocks = (await service.standing()).filter((line) => line.startsWith('clock'));
    expect(clocks).toHaveLength(byMs < 0 ? 2 : 0);
  });

  it.each(steps)(
    'set %s while a point falls silent: it is overdue after its span, not earlier or later',
    async (_, byMs) => {
      const service = await trial();
      const works = new Works(service);
      for (let n = 0; n < 2; n++) await works.hour();
      await works.set(byMs);
      await works.pass(40 * minuteMs);
      expect(await works.overdueEver()).toEqual([]);
      await works.pass(30 * minuteMs);
      expect(await works.overdueEver()).toHaveLength(3);
    },
  );

  it('set back by a day and right again: what came before and after is judged, and the trouble ends', async () => {
    const service = await trial();
    const works = new Works(service);
    for (let n = 0; n < 2; n++) await works.hour();
    await works.set(-dayMs);
    for (let n = 0; n < 2; n++) await works.hour();
    await works.set(dayMs);
    for (let n = 0; n < 3; n++) await works.hour(5);
    await works.everyFileOnce();
    expect(await works.overdueEver()).toEqual([]);
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    const rows = await service.rows('recordings', 'evaluated, count(*) as n', 'group by evaluated');
    expect(rows).toEqual([{ evaluated: 1, n: 14 }]);
  });

  it('set back while the service is off: arrivals to come do not keep a silent point from being overdue', async () => {
    const on = site();
    const first = await serviceOn(on);
    const works = new Works(first);
    for (let n = 0; n < 2; n++) await works.hour();
    await first.stop();
    const again = await serviceOn(on, { clock: new SteppedClock(first.clock.wallMs() - dayMs) });
    const after = new Works(again);
    await after.pass(hourMs);
    expect(await after.overdueEver()).toEqual([]);
    await after.pass(80 * minuteMs);
    expect(await after.overdueEver()).toHaveLength(3);
  });

  it('set to next year by mistake and right again: a summary every morning, once a local date', async () => {
    const server = await MailServerOnLoopback.start();
    const service = await trial({ mailPort: server.port, recordings: 'overdue_after: 1000 h' });
    const works = new Works(service);
    const dates = async () =>
      (await service.rows('summaries', 'local_date', 'order by created_ms, local_date')).map(
        ({ local_date }) => local_date,
      );
    await works.pass(hourMs);
    await works.set(365 * dayMs);
    await works.pass(hourMs);
    await works.set(-365 * dayMs);
    for (let n = 0; n < 3; n++) await works.pass(dayMs);
    await service.service.mailRound(true);
    const days = Array.from({ length: 4 }, (_, n) => localDate(beginMs + n * dayMs, 'Europe/Dublin'));
    const nextYear = localDate(beginMs + 365 * dayMs, 'Europe/Dublin');
    expect((await dates()).sort()).toEqual([...days, nextYear].sort());
  });
});
