/** Loggers' clocks as they are: set back, set ahead, without a zone. No point is blinded, no exceedance is silent. */
import { describe, expect, it } from 'vitest';
import { localDate, localTime } from '../../src/config/local-time.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { beginMs, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const minuteMs = 60_000;
const dayMs = 24 * hourMs;
const alarm = 'overall-fixed-upper pump-2/de-v';
const clockTrouble = 'clock pump-2_<any>.wav trouble';
const tone = (level: number, seed: number) => wav([signal(level, seed, 512)]);
const pumpRecordings = (text: string) => ({
  recordings: 'overdue_after: 1000 h',
  pump: `recordings:\n  ${(text === '' ? 'overdue_after: 2 h' : text).replaceAll('\n', '\n  ')}`,
});

/** The pump's logger: its clock shows the right time plus `errorMs`. */
class PumpLogger {
  readonly service: TrialService;
  errorMs = 0;
  #seed = 1;

  constructor(service: TrialService) {
    this.service = service;
  }

  /** A file that was begun so long ago, by a clock that shows so much. */
  drop(level: number, agoMs = 0, errorMs = this.errorMs): void {
    const shownMs = this.service.clock.wallMs() - agoMs + errorMs;
    this.service.drop(`pump-2_${stamp(shownMs)}.wav`, tone(level, this.#seed++));
  }

  async send(level: number): Promise<void> {
    this.drop(level);
    await this.service.take();
    await this.service.after(61_000);
  }

  /** Files of every hour, the last one just begun. */
  async sendBatch(levels: readonly number[], agoMs = 0): Promise<void> {
    levels.forEach((level, n) => {
      this.drop(level, agoMs + (levels.length - 1 - n) * hourMs);
    });
    await this.service.take();
    await this.service.after(61_000);
  }

  /** Wall time at which the first event of the alarm was decided to be told. */
  async toldMs(): Promise<number | null> {
    const [row] = await this.service.rows(
      'to_tell',
      'wall_ms',
      "where key like 'limit:pump-2%' order by id limit 1",
    );
    return row === undefined ? null : (row.wall_ms as number);
  }

  evaluated(): Promise<Record<string, unknown>[]> {
    return this.service.rows(
      'recordings',
      'file_name, used_ms, evaluated, quality',
      'where source_id is not null order by id',
    );
  }
}

const quiet = Array<number>(24).fill(1);

describe('a clock set back', () => {
  it('by 30 days, in batches of 24 a day: an exceedance is told with the first batch', async () => {
    const service = await trial(pumpRecordings('overdue_after: 26 h'));
    const logger = new PumpLogger(service);
    for (const day of [1, 2]) {
      service.toHour(24 * day);
      await logger.sendBatch(quiet);
    }
    logger.errorMs = -30 * dayMs;
    service.toHour(72);
    const arrivedMs = service.clock.wallMs();
    await logger.sendBatch(quiet.with(9, 5).with(10, 5));
    expect((await logger.toldMs()) as number).toBeLessThan(arrivedMs + 2 * minuteMs);
    for (const day of [4, 5]) {
      service.toHour(24 * day);
      await logger.sendBatch(quiet.fill(5, 12));
    }
    expect(await service.standing()).toEqual([`${alarm} alert`, clockTrouble].sort());
    expect((await logger.evaluated()).slice(-24).every(({ evaluated }) => evaluated === 1)).toBe(true);
  });

  it('by 30 days with two files an hour: told at once as late, and an alarm within two hours', async () => {
    const service = await trial(pumpRecordings('expected_every: 30 min\noverdue_after: 1 h'));
    const logger = new PumpLogger(service);
    for (let n = 0; n < 4; n++) {
      service.toHour(n / 2);
      await logger.send(1);
    }
    logger.errorMs = -30 * dayMs;
    for (let n = 4; n < 9; n++) {
      service.toHour(n / 2);
      await logger.send(5);
      if (n === 4) expect((await service.journal()).at(-1)).toMatch(/^exceeded-came-late/);
    }
    const raised = await service.rows('journal', 'wall_ms', "where event = 'raised' and key like 'limit:%'");
    expect(raised[0]?.wall_ms as number).toBeLessThan(beginMs + 4 * hourMs);
    expect(await service.standing()).toEqual([clockTrouble, `${alarm} alert`].sort());
  });

  it('to 2000 at each power cycle: told within two hours, each time judged again', async () => {
    const service = await trial(pumpRecordings(''));
    const logger = new PumpLogger(service);
    for (const hour of [0, 1, 2]) {
      service.toHour(hour);
      await logger.send(1);
    }
    for (const cycle of [0, 1, 2]) {
      for (let n = 0; n < 4; n++) {
        service.toHour(3 + 4 * cycle + n);
        if (n === 0) logger.errorMs = Date.UTC(2000, 0, 1) - service.clock.wallMs();
        await logger.send(cycle === 1 ? 5 : 1);
      }
    }
    const told = (await logger.toldMs()) as number;
    expect(told).toBeLessThan(beginMs + 7 * hourMs + 2 * minuteMs);
    const journal = await service.journal();
    expect(journal).toContain(`raised ${alarm}`);
    // A recording flagged for its clock holds an alarm, and never clears it.
    expect(await service.standing()).toEqual([clockTrouble, `${alarm} alert`].sort());
    // Two of a cycle are late, which is told; then the point would be blind, and the clock's offset is found anew.
    const cycle = [0, 0, 1, 1];
    const evaluated = (await logger.evaluated()).slice(3).map((row) => row.evaluated);
    expect(evaluated).toEqual([...cycle, ...cycle, ...cycle]);
  });

  it('to the same start at every file blinds nobody: one is judged in every overdue span', async () => {
    const service = await trial(pumpRecordings(''));
    const logger = new PumpLogger(service);
    await logger.send(1);
    for (let n = 1; n <= 18; n++) {
      service.toHour(n / 3);
      logger.errorMs = Date.UTC(2000, 0, 1) - service.clock.wallMs();
      await logger.send(5);
    }
    const rows = await service.rows('recordings', 'arrived_ms', 'where evaluated = 1 order by id');
    const arrived = rows.map(({ arrived_ms }) => arrived_ms as number);
    const gaps = arrived.slice(1).map((ms, n) => ms - (arrived[n] as number));
    expect(Math.max(...gaps)).toBeLessThanOrEqual(2 * hourMs + 20 * minuteMs);
    expect(arrived.length).toBeGreaterThan(4);
    expect(await service.standing()).toContain(`${alarm} alert`);
  });

  it('by three hours: judged from the first recording on, because its place is taken', async () => {
    const service = await trial(pumpRecordings(''));
    const logger = new PumpLogger(service);
    for (let hour = 0; hour < 6; hour++) {
      service.toHour(hour);
      await logger.send(1);
    }
    logger.errorMs = -3 * hourMs;
    for (const hour of [6, 7]) {
      service.toHour(hour);
      await logger.send(5);
    }
    expect(await service.standing()).toEqual([clockTrouble, `${alarm} alert`].sort());
    expect(await service.rows('sources', 'clock_offset_ms')).toEqual([{ clock_offset_ms: 3 * hourMs }]);
    logger.errorMs = 0;
    service.toHour(8);
    await logger.send(5);
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    expect(await service.rows('sources', 'clock_offset_ms')).toEqual([{ clock_offset_ms: 0 }]);
  });
});

describe('a clock ahead', () => {
  it('by three minutes is nothing; by a day it is trouble with an offset until it is set right', async () => {
    const service = await trial(pumpRecordings(''));
    const logger = new PumpLogger(service);
    logger.errorMs = 3 * minuteMs;
    for (const hour of [0, 1, 2]) {
      service.toHour(hour);
      await logger.send(1);
    }
    expect(await service.standing()).toEqual([]);
    expect((await logger.evaluated()).map(({ quality }) => quality)).toEqual(Array(3).fill('[]'));
    logger.errorMs = dayMs;
    for (const hour of [3, 4, 5]) {
      service.toHour(hour);
      await logger.send(hour === 3 ? 1 : 5);
      expect(await service.standing()).toContain(clockTrouble);
    }
    expect(await service.standing()).toContain(`${alarm} alert`);
    expect(await service.rows('sources', 'clock_offset_ms')).toEqual([{ clock_offset_ms: -dayMs }]);
    logger.errorMs = 0;
    service.toHour(6);
    await logger.send(5);
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    const used = (await logger.evaluated()).map(({ used_ms }) => used_ms as number);
    expect(used).toEqual([...used].sort((a, b) => a - b));
  });
});

describe('a logger without a zone', () => {
  const changes: readonly [string, number][] = [
    ['spring', Date.UTC(2026, 2, 28)],
    ['autumn', Date.UTC(2026, 9, 24)],
  ];
  const localStamp = (ms: number) => {
    const { hour, minute } = localTime(ms, 'Europe/Dublin');
    const two = (n: number) => String(n).padStart(2, '0');
    return `${localDate(ms, 'Europe/Dublin').replaceAll('-', '')}T${two(hour)}${two(minute)}00Z`;
  };

  it.each(changes)(
    'sends every hour through the change of %s: each once, in order, none late',
    async (_, fromMs) => {
      const clock = new SteppedClock(fromMs);
      const service = await trial(pumpRecordings('clock: site'), { clock });
      for (let hour = 0; hour < 72; hour++) {
        clock.advance(fromMs + hour * hourMs + 10_000 - clock.wallMs());
        service.drop(`pump-2_${localStamp(clock.wallMs())}.wav`, tone(1, hour + 1));
        expect(await service.take()).toMatchObject({ taken: 1, waiting: 0 });
      }
      const rows = await service.rows('recordings', 'used_ms, evaluated, quality, outcome', 'order by id');
      expect(rows).toEqual(
        Array.from({ length: 72 }, (_, hour) => ({
          used_ms: fromMs + hour * hourMs,
          evaluated: 1,
          quality: '[]',
          outcome: 'taken',
        })),
      );
      expect(await service.standing()).toEqual([]);
    },
  );

  it('uploads once a day, two files an hour, through the change of autumn: each once, in order, none late', async () => {
    const fromMs = Date.UTC(2026, 9, 24);
    const clock = new SteppedClock(fromMs);
    const service = await trial(pumpRecordings('clock: site\nexpected_every: 30 min\noverdue_after: 26 h'), {
      clock,
    });
    const perDay = 48;
    for (let day = 1; day <= 3; day++) {
      clock.advance(dayMs);
      for (let n = 0; n < perDay; n++) {
        const number = (day - 1) * perDay + n;
        const name = `pump-2_${String(number).padStart(4, '0')}_${localStamp(fromMs + (number * hourMs) / 2)}.wav`;
        service.drop(name, tone(1, number + 1));
      }
      await service.take();
      await service.after(61_000);
    }
    const rows = await service.rows('recordings', 'used_ms, evaluated, quality', 'order by id');
    expect(rows).toEqual(
      Array.from({ length: 3 * perDay }, (_, n) => ({
        used_ms: fromMs + (n * hourMs) / 2,
        evaluated: 1,
        quality: '[]',
      })),
    );
    expect(await service.standing()).toEqual([]);
  });
});
