/** The morning summary from a real ledger: once a date, complete, in one transaction, and as files. */
import { existsSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { gatherSummary } from '../../src/service/summary-gather.ts';
import { alarmByNumber } from '../../src/store/alarms.ts';
import { readJournal } from '../../src/store/journal.ts';
import { readSummary } from '../../src/store/summaries.ts';
import { ann, type BenchOptions, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

async function bench(options: BenchOptions = {}) {
  const server = await MailServerOnLoopback.start();
  const b = await MailBench.start({ port: server.port, to: [{ address: ann }], ...options });
  // The watch begins with the first entry of the journal.
  await b.look('drop-folder', true);
  await b.look('drop-folder', false);
  return { server, bench: b };
}

const facts = (b: MailBench, upSinceMs = 0) =>
  gatherSummary({ ledger: b.ledger, view: b.view, nowMs: b.clock.wallMs(), upSinceMs });

/** Hourly recordings of every point, `hours` long. */
async function hourly(b: MailBench, hours: number, level: (hour: number, path: string) => number | null) {
  for (let hour = 0; hour < hours; hour++) {
    for (const { machineId, id } of b.view.points) {
      const value = level(hour, `${machineId}/${id}`);
      if (value !== null) await b.record(`${machineId}/${id}`, { overall: value });
    }
    b.clock.advance(hourMs);
  }
}

describe('the morning', () => {
  it('comes once a local date, by mail and as files, and not for a morning before the first start', async () => {
    const { server, bench: b } = await bench();
    expect(await b.rounds.morning()).toBe(null);
    await b.pass(22 * hourMs, hourMs);
    expect(await b.rounds.morning()).toBe(null);
    await b.pass(30 * minuteMs);
    expect(await b.rounds.morning()).toBe('2026-12-02');
    expect(await b.rounds.morning()).toBe(null);
    b.restart();
    expect(await b.rounds.morning()).toBe(null);
    await b.pass(minuteMs);
    const summaries = server
      .to(ann)
      .filter(({ subject }) => subject?.startsWith('Larkfen Waterworks, Wed 2 Dec'));
    expect(summaries.length).toBe(1);
    const folder = join(b.view.site.folders.data, 'summary');
    expect(readdirSync(folder).sort()).toEqual(['2026-12-02.html', 'latest.html']);
    expect(readFileSync(join(folder, 'latest.html'), 'utf8')).toContain('Larkfen Waterworks');
    expect(
      JSON.parse((await b.ledger.read((reader) => readSummary(reader)))?.facts ?? '').sections.length,
    ).toBe(7);
  });

  it('is made up for after a pause, for the last morning only', async () => {
    const { bench: b } = await bench();
    b.clock.advance(5 * dayMs + 3 * hourMs);
    expect(await b.rounds.morning()).toBe('2026-12-06');
    expect(await b.rounds.morning()).toBe(null);
  });

  it('stopped between ledger and files, has its file after the next start', async () => {
    const { bench: b } = await bench();
    b.clock.advance(dayMs);
    b.step = (name) => {
      if (name === 'summary: stored') throw new Error('stopped');
    };
    await expect(b.rounds.morning()).rejects.toThrow('stopped');
    const folder = join(b.view.site.folders.data, 'summary');
    expect(existsSync(folder)).toBe(false);
    b.step = () => {};
    b.restart();
    expect(await b.rounds.morning()).toBe(null);
    expect(readdirSync(folder).sort()).toEqual(['2026-12-02.html', 'latest.html']);
  });

  it('is stored and sent although its file cannot be written', async () => {
    const { server, bench: b } = await bench();
    b.clock.advance(dayMs);
    const folder = join(b.view.site.folders.data, 'summary');
    rmSync(folder, { recursive: true, force: true });
    writeFileSync(folder, 'in the way');
    expect(await b.rounds.morning()).toBe('2026-12-02');
    await b.pass(minuteMs);
    expect(server.got.some(({ mail }) => mail.subject?.includes('Wed 2 Dec'))).toBe(true);
    expect(b.logged.join()).toContain('the summary cannot be written to the data folder');
  });

  it('acknowledges troubles that are over, and told by it; alarms never', async () => {
    const { bench: b } = await bench();
    await b.look('overdue', true, { machineId: 'blower', pointId: 'de' });
    await b.look('unreadable', true, { source: 'blower_#' });
    await b.look('unreadable', false, { source: 'blower_#' });
    await b.record('blower/nde', { overall: 3 });
    await b.record('blower/nde', { overall: 1 });
    b.clock.advance(dayMs);
    await b.rounds.morning();
    const { facts: said } = (await b.ledger.read((reader) => readSummary(reader))) ?? { facts: '{}' };
    const { sections } = JSON.parse(said) as {
      sections: { name: string; findings: { number: number | null }[] }[];
    };
    const numbers = (name: string) =>
      sections.find((section) => section.name === name)?.findings.map(({ number }) => number);
    expect(numbers('needs')).toEqual([4, 2]);
    expect(numbers('known')).toEqual([1, 3]);
    const ended = async (number: number) =>
      (await b.ledger.read((reader) => alarmByNumber(reader, number)))?.life.endedWallMs ?? null;
    expect(await Promise.all([1, 2, 3, 4].map(ended))).toEqual([
      b.clock.wallMs(),
      null,
      b.clock.wallMs(),
      null,
    ]);
    const journal = await b.ledger.read((reader) => readJournal(reader, { limit: 3 }));
    expect(journal.map(({ event, number }) => [event, number])).toEqual([
      ['acknowledged', 3],
      ['acknowledged', 1],
      ['returned', 4],
    ]);
  });
});

describe('what it says', () => {
  it('of each point: judged, blind, without a limit, stopped, out of service', async () => {
    const tree = {
      blower: { de: ['overall'], nde: ['overall'] },
      pump: { de: ['overall'], nde: ['overall'] },
      fan: { de: ['overall'] },
    };
    const { bench: b } = await bench({ tree, machine: { running: { by: 'sidecar' } } });
    const running = (runningSaid: boolean) => ({ more: { runningSaid } });
    await b.record('blower/de', { overall: 1 }, running(true));
    await b.record('pump/de', { overall: 0.1 }, running(false));
    await b.record('pump/nde', { overall: 3 }, running(false));
    await b.record('fan/de', { overall: 3 }, running(true));
    await b.command(2, 'out-of-service', { untilMs: b.clock.wallMs() + dayMs });
    await b.record('blower/nde', { overall: 1 }, running(true));
    await b.look('dead-sensor', true, { machineId: 'blower', pointId: 'nde' });
    await b.look('dead-sensor', true, { machineId: 'blower', pointId: 'nde' });
    const { points, standing } = await facts(b);
    expect(points.map(({ machine, point, judging }) => [`${machine.id}/${point.id}`, judging])).toEqual([
      ['blower/de', 'judged'],
      ['blower/nde', 'blind'],
      ['pump/de', 'stopped'],
      ['pump/nde', 'stopped'],
      ['fan/de', 'out-of-service'],
    ]);
    expect(standing.find(({ number }) => number === 2)).toMatchObject({
      standing: 'out-of-service',
      suppressedUntilMs: b.clock.wallMs() + dayMs,
    });
    b.clock.advance(3 * hourMs);
    expect((await facts(b)).points.map(({ judging }) => judging)).toEqual([
      'blind',
      'blind',
      'blind',
      'blind',
      'out-of-service',
    ]);
  });

  it('of a band: the newest level with its interval, and its change against the week before, of one series', async () => {
    const { bench: b } = await bench({ tree: { blower: { de: ['overall'] } } });
    await hourly(b, 8 * 24, (hour) => (hour < 7 * 24 ? 1 + (hour % 3) * 0.01 : 1.5));
    const band = (await facts(b)).points[0]?.bands[0];
    expect(band?.level).toMatchObject({ level: 0.0015, intervalLow: 0.00135, confidencePercent: 95 });
    expect(band?.change?.ratio).toBeCloseTo(1.5 / 1.01, 2);
    expect(band?.change?.worse).toBe(true);
    // New settings begin a new series: nothing to compare with yet.
    await b.record(
      'blower/de',
      { overall: 2 },
      {
        more: {
          levels: [
            {
              bandId: 'overall',
              fingerprint: 'settings-2',
              fromHz: 10,
              toHz: 1000,
              quantity: 'velocity',
              level: 0.002,
              intervalLow: 0.0019,
              intervalHigh: 0.0021,
              confidencePercent: 95,
              exceededBy80Percent: null,
              atLeast: false,
            },
          ],
        },
      },
    );
    const after = (await facts(b)).points[0]?.bands[0];
    expect(after?.level?.level).toBe(0.002);
    expect(after?.change).toBe(null);
  });

  it('counts recordings by point, so that a surplus of one hides no gap of another', async () => {
    const { bench: b } = await bench();
    await hourly(b, 30, (hour, path) => (path === 'blower/nde' && hour >= 20 && hour < 25 ? null : 1));
    for (let index = 0; index < 10; index++) {
      await b.record('blower/de', { overall: 1 }, { usedMs: b.clock.wallMs() - hourMs - index * minuteMs });
    }
    expect((await facts(b)).recordings).toMatchObject({ received: 43, expected: 48, late: 0, repeats: 0 });
  });

  it('expects nothing from before the first start', async () => {
    const { bench: b } = await bench();
    await hourly(b, 6, () => 1);
    expect((await facts(b)).recordings).toMatchObject({ received: 12, expected: 12 });
  });

  it('counts alarms of yesterday and of the week, and names the most frequent', async () => {
    const { bench: b } = await bench({ tree: { blower: { de: ['overall'] }, pump: { de: ['overall'] } } });
    for (let index = 0; index < 3; index++) {
      await b.record('pump/de', { overall: 3 });
      await b.command(2 + index, 'acknowledge');
      await b.record('pump/de', { overall: 1 });
      b.clock.advance(minuteMs);
    }
    await b.record('blower/de', { overall: 3 });
    b.clock.advance(20 * hourMs);
    await b.record('pump/de', { overall: 6 });
    b.clock.advance(2 * hourMs);
    const { history } = await facts(b);
    expect(history.yesterday).toBe(4);
    expect(history.week).toBe(5);
    expect(history.frequent.map(({ machine, count }) => [machine.id, count])).toEqual([
      ['pump', 4],
      ['blower', 1],
    ]);
  });

  it('of the service: up since, mail, and how long the disk lasts at the present rate', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    const upSinceMs = b.clock.wallMs() - hourMs;
    expect((await facts(b, upSinceMs)).service).toMatchObject({
      upSinceMs,
      mailWaiting: 0,
      mailFailed: 0,
      mailLastAcceptedMs: b.clock.wallMs(),
      mailLastAnswer: null,
      diskDaysLeft: null,
      lastBackupMs: null,
    });
    await server.stop();
    await b.record('blower/nde', { overall: 6 });
    await b.pass(dayMs, hourMs);
    const { service } = await facts(b);
    // The danger, and the trouble of the drop folder that was due at the same time.
    expect(service.mailWaiting).toBe(2);
    expect(service.mailLastAnswer).toMatch(/ECONNREFUSED/);
    // Two recordings of 4096 bytes in the day that the watch has lasted.
    const watchedMs = b.clock.wallMs() - Date.UTC(2026, 11, 1, 8);
    expect(service.diskDaysLeft).toBeCloseTo((service.diskFreeBytes ?? 0) / ((8192 * dayMs) / watchedMs), -3);
  });
});
