/** What the service makes of recordings over hours: alarms, silence, standing machines, wrong clocks, repeated content. */
import { utimesSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { beginMs, frames, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const patient = { recordings: 'overdue_after: 100 h' };
const pump = (hour: number, ending = 'wav') => `pump-2_${stamp(beginMs + hour * hourMs)}.${ending}`;
const clock = 'clock pump-2_<any>.wav trouble';
const alarm = 'overall-fixed-upper pump-2/de-v';

/** One recording of the pump in an hour of its own. */
async function pumpHour(
  service: TrialService,
  hour: number,
  bytes: Uint8Array,
  sidecar?: string,
): Promise<void> {
  service.toHour(hour);
  if (sidecar !== undefined) service.drop(pump(hour, 'json'), sidecar);
  service.drop(pump(hour), bytes);
  await service.take();
}

async function told(service: TrialService): Promise<string[]> {
  const rows = await service.rows('to_tell', 'key, event, severity', 'order by id');
  return rows.map(({ key, event, severity }) => `${event} ${severity} ${key}`);
}

describe('an alarm', () => {
  it('is raised after its on-delay, rises, and returns, each told but the return', async () => {
    const service = await trial(patient);
    const levels = [1, 5, 1, 5, 5, 9, 9, 1];
    const standing: string[][] = [];
    for (const [hour, level] of levels.entries()) {
      await pumpHour(service, hour, wav([level], hour + 1));
      standing.push(await service.standing());
    }
    const alert = [`${alarm} alert`];
    expect(standing.slice(0, 5)).toEqual([[], [], [], [], alert]);
    expect(standing.slice(6)).toEqual([[`${alarm} danger`], []]);
    expect(await service.journal()).toEqual(
      expect.arrayContaining([`raised ${alarm}`, `rose ${alarm}`, `returned ${alarm}`]),
    );
    expect((await told(service)).map((line) => line.split(' ').slice(0, 2).join(' '))).toEqual([
      'raised alert',
      'rose danger',
    ]);
  });

  it('is never cleared by a flagged recording, only by a sound one', async () => {
    const service = await trial(patient);
    for (const hour of [0, 1]) await pumpHour(service, hour, wav([5], hour + 1));
    const withGap = signal(1, 9);
    withGap.fill(0, 400, 460);
    for (const hour of [2, 3, 4]) {
      await pumpHour(service, hour, wav([withGap]));
      expect(await service.standing()).toEqual([`${alarm} alert`]);
    }
    await pumpHour(service, 5, wav([1], 6));
    expect(await service.standing()).toEqual([]);
  });

  it('whose recording comes late is journalled and told, and changes no state', async () => {
    const service = await trial(patient);
    await pumpHour(service, 0, wav([1], 1));
    await pumpHour(service, 2, wav([1], 3));
    service.drop(pump(1), wav([5], 2));
    await service.take();
    expect(await service.standing()).toEqual([]);
    expect(await service.journal()).toEqual(['started', 'exceeded-came-late']);
    expect(await told(service)).toEqual([expect.stringMatching(/^exceeded-came-late alert limit:pump-2/)]);
    expect(await service.rows('recordings', 'evaluated', "where file_name = '".concat(pump(1), "'"))).toEqual(
      [{ evaluated: 0 }],
    );
  });
});

describe('silence', () => {
  it('is overdue after its span, told once, and over with the next recording', async () => {
    const service = await trial();
    await service.hour(0);
    await service.after(hourMs + 59 * 60_000);
    expect(await service.standing()).toEqual([]);
    await service.after(2 * 60_000);
    const overdue = [
      'overdue press-1/de-h trouble',
      'overdue press-1/nde-h trouble',
      'overdue pump-2/de-v trouble',
    ];
    expect(await service.standing()).toEqual(overdue);
    for (let n = 0; n < 10; n++) await service.after(30 * 60_000);
    expect((await told(service)).length).toBe(3);
    await pumpHour(service, 8, wav([1]));
    expect(await service.standing()).toEqual(overdue.slice(0, 2));
  });

  it('before the first recording ever is overdue too', async () => {
    const service = await trial();
    await service.after(0);
    await service.after(2 * hourMs + 6_000);
    expect(await service.standing()).toHaveLength(3);
  });
});

describe('a machine that stands', () => {
  const watched = {
    ...patient,
    pump: 'running: speed above 300 rpm\nafter_start: 90 min\nrecordings:\n  sidecar: expected',
  };
  const speed = (rpm: number) => `{"speed_rpm": ${rpm}}`;

  it('neither trends nor clears nor is dead; after a start it is transient before it is judged', async () => {
    const service = await trial(watched);
    for (const hour of [0, 1]) await pumpHour(service, hour, wav([5], hour + 1), speed(1480));
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    for (const hour of [2, 3, 4]) await pumpHour(service, hour, wav([0.002], hour + 1), speed(0));
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    for (const hour of [5, 6]) await pumpHour(service, hour, wav([1], hour + 1), speed(1480));
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    await pumpHour(service, 7, wav([1], 8), speed(1480));
    expect(await service.standing()).toEqual([]);
    const rows = await service.rows('measurements', 'machine_state', 'order by used_ms');
    expect(rows.map(({ machine_state }) => machine_state)).toEqual([
      'running',
      'running',
      'stopped',
      'stopped',
      'stopped',
      'transient',
      'transient',
      'running',
    ]);
    expect(await service.rows('levels', 'count(*) as n', 'where in_trend = 1')).toEqual([{ n: 3 }]);
  });
});

describe('content that comes again', () => {
  it('with another stated start is a recording of its own: a dead sensor sends the same file every hour', async () => {
    const service = await trial(patient);
    const dead = wav([new Float64Array(frames).fill(0.25)]);
    for (const hour of [0, 1, 2]) await pumpHour(service, hour, dead);
    expect(Object.values(await service.outcomes())).toEqual(['taken', 'taken', 'taken']);
    expect(await service.rows('recordings', 'sum(evaluated) as n')).toEqual([{ n: 3 }]);
    expect(await service.standing()).toEqual(['dead-sensor pump-2/de-v trouble']);
    await pumpHour(service, 3, wav([1]));
    expect(await service.standing()).toEqual([]);
  });

  it('without a stated start is kept out of trend and alarms; twice in a row the logger repeats itself', async () => {
    const service = await trial(patient);
    const same = wav([5], 1);
    for (const [n, letter] of ['a', 'b', 'c', 'd'].entries()) {
      service.toHour(n);
      const name = `pump-2_${letter}.wav`;
      service.drop(name, same);
      const at = new Date(service.clock.wallMs());
      utimesSync(join(service.site.drop, name), at, at);
      await service.take();
    }
    expect(await service.standing()).toEqual(['repeats-itself pump-2_<any>.wav trouble']);
    expect(await service.rows('levels', 'count(*) as n', 'where in_trend = 1')).toEqual([{ n: 1 }]);
    expect(await service.rows('recordings', 'sum(evaluated) as n')).toEqual([{ n: 1 }]);
  });
});

describe("a logger's clock", () => {
  it('set back to 2000 blinds no point: the recordings count from their arrival, and their alarm is raised', async () => {
    const service = await trial();
    for (const hour of [0, 1, 2]) await pumpHour(service, hour, wav([1], hour + 1));
    const backMs = beginMs - Date.UTC(2000, 0, 1);
    for (const hour of [3, 4, 5, 6, 7, 8]) {
      service.toHour(hour);
      service.drop(`pump-2_${stamp(beginMs + hour * hourMs - backMs)}.wav`, wav([5], hour + 1));
      await service.take();
      await service.after(120_000);
    }
    expect(await service.standing()).toEqual(expect.arrayContaining([`${alarm} alert`, clock]));
    service.toHour(9);
    await pumpHour(service, 9, wav([5], 10));
    expect(await service.standing()).toContain(`${alarm} alert`);
    expect(await service.standing()).not.toContain(clock);
  });

  it('a day ahead counts from the arrival, flagged, and in trouble until it is right again', async () => {
    const service = await trial(patient);
    await pumpHour(service, 0, wav([1], 1));
    service.toHour(1);
    service.drop(pump(25), wav([1], 2));
    await service.take();
    expect(await service.standing()).toEqual(['clock pump-2_<any>.wav trouble']);
    const [row] = await service.rows(
      'recordings',
      'used_ms - arrived_ms as late',
      'order by id desc limit 1',
    );
    expect(row).toEqual({ late: 0 });
    await pumpHour(service, 2, wav([1], 3));
    expect(await service.standing()).toEqual([]);
  });
});

describe('a backlog', () => {
  it('dropped in any order is evaluated in the order of its recording, and its standing alarm is told', async () => {
    const service = await trial(patient);
    service.toHour(30);
    for (const hour of [7, 3, 5, 1, 6, 2, 4, 0]) {
      service.drop(pump(hour), wav([hour >= 6 ? 5 : 1], hour + 1));
      await service.after(20_000);
    }
    expect(Object.keys(await service.outcomes())).toEqual([]);
    await service.after(20_000);
    await service.after(60_000);
    expect(Object.keys(await service.outcomes())).toEqual([0, 1, 2, 3, 4, 5, 6, 7].map((hour) => pump(hour)));
    expect(await service.standing()).toEqual([`${alarm} alert`]);
    expect(await service.rows('to_tell', 'event, from_backlog')).toEqual([
      { event: 'raised', from_backlog: 1 },
    ]);
  });
});
