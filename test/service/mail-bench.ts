import { createMailer, type MailerOptions } from '../../src/advisory/mailer.ts';
import type { Limit, Machine, MailSettings, Recipient, Site } from '../../src/config/site.ts';
import type { AlarmCommandName } from '../../src/detection/alarm-event.ts';
import { alarmStep } from '../../src/detection/alarm-state.ts';
import { changeOf, type TroubleLook, type TroubleSubject, troubleRule } from '../../src/detection/trouble.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { evaluate, lookAtTrouble } from '../../src/service/evaluate.ts';
import { learn } from '../../src/service/learn.ts';
import { Complaints, createLog } from '../../src/service/log.ts';
import { MailRounds } from '../../src/service/mail-rounds.ts';
import type { MailTools } from '../../src/service/mail-tools.ts';
import { type SiteView, siteView } from '../../src/service/site-view.ts';
import type { Step } from '../../src/service/steps.ts';
import { alarmByNumber } from '../../src/store/alarms.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { type ChangeContext, saveAlarmChange } from '../../src/store/save-alarm.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { noteArrival } from '../../src/store/sources.ts';
import { putOutOfService, setShelf } from '../../src/store/suppressions.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { recordingOf } from '../store/new-recording.ts';
import { measurementOf, smallSite, type Tree } from '../store/small-site.ts';
import { opened, temporaryFolder } from '../store/temporary-ledger.ts';

export const minuteMs = 60_000;
export const hourMs = 3_600_000;
export const dayMs = 24 * hourMs;
/** Tue 1 Dec 2026, 08:00 in Dublin: after the summary of the day. */
export const beginMs = Date.UTC(2026, 11, 1, 8);
export const ann = 'ann@larkfen.example';
export const ben = 'ben@larkfen.example';

export interface BenchOptions {
  readonly tree?: Tree;
  readonly port?: number;
  readonly to?: readonly Partial<Recipient>[];
  readonly mail?: Partial<MailSettings>;
  readonly mailer?: MailerOptions;
  readonly limit?: Partial<Limit>;
  readonly machine?: Partial<Machine>;
  readonly step?: Step;
}

/** Ledger, clock, site and the mail rounds over them; recordings come in as levels, as intake would store them. */
export class MailBench {
  readonly clock: SteppedClock;
  readonly ledger: Ledger;
  readonly view: SiteView;
  readonly logged: string[] = [];
  step: Step;
  backlogRuns = false;
  rounds: MailRounds;
  #recordings = 0;
  readonly #options: BenchOptions;

  static async start(options: BenchOptions = {}, folder = temporaryFolder()): Promise<MailBench> {
    const clock = new SteppedClock(beginMs);
    const ledger = await opened(folder, { wallMs: () => clock.wallMs(), wait: async () => {} });
    const site = benchSite(options, folder);
    const view = await ledger.transact(async (writer) => {
      const { ids } = await syncSite(writer, site, { text: 'site', wallMs: beginMs });
      return siteView(site, ids);
    });
    return new MailBench(options, { clock, ledger, view });
  }

  constructor(options: BenchOptions, parts: { clock: SteppedClock; ledger: Ledger; view: SiteView }) {
    this.#options = options;
    this.clock = parts.clock;
    this.ledger = parts.ledger;
    this.view = parts.view;
    this.step = options.step ?? (() => {});
    this.rounds = new MailRounds(this.tools());
  }

  tools(): MailTools {
    const log = createLog({ write: (line) => this.logged.push(line) });
    return {
      ledger: this.ledger,
      clock: this.clock,
      view: () => this.view,
      log,
      complaints: new Complaints(log, () => this.clock.monotonicMs()),
      step: (name) => this.step(name),
      startedMs: beginMs,
      backlogRuns: () => this.backlogRuns,
      mailerFor: (server) =>
        createMailer(server, { connectTimeoutMs: 5_000, idleTimeoutMs: 5_000, ...this.#options.mailer }),
    };
  }

  /** As if the service had been stopped and started: nothing is remembered but the ledger. */
  restart(): void {
    this.rounds = new MailRounds(this.tools());
  }

  /** A recording of one point with these levels (mm/s r.m.s.), now; its alarms and troubles with it. */
  async record(
    path: string,
    levels: Readonly<Record<string, number>>,
    how: {
      readonly usedMs?: number;
      readonly fromBacklog?: boolean;
      readonly late?: boolean;
      readonly more?: Partial<Measurement>;
    } = {},
  ): Promise<void> {
    const { view } = this;
    const [machineId = '', pointId = ''] = path.split('/');
    const wallMs = this.clock.wallMs();
    const usedMs = how.usedMs ?? wallMs;
    const si = Object.fromEntries(Object.entries(levels).map(([band, level]) => [band, level / 1000]));
    const measurement = measurementOf(machineId, pointId, si, how.more);
    const number = ++this.#recordings;
    await this.ledger.transact(async (writer) => {
      const late = how.late ?? false;
      const input = { view, measurements: [measurement], usedMs, late, judged: true, recordingFlags: [] };
      const recordingId = await insertRecording(
        writer,
        recordingOf({
          identity: `identity-${number}`,
          contentSha256: `content-${number}`,
          fileName: `${machineId}_${number}.wav`,
          configVersionId: view.ids.configVersionId,
          arrivedMs: wallMs,
          statedMs: usedMs,
          usedMs,
          evaluated: !late,
        }),
      );
      for (const one of await evaluate(writer, input)) {
        await insertMeasurement(writer, view.ids, {
          measurement: one.measurement,
          recordingId,
          usedMs,
          machineState: one.machineState,
          condition: one.condition,
          runningHours: one.runningHours,
          evaluated: !late,
          inTrend: one.machineState === 'running',
          atAlarm: false,
        });
        for (const change of one.changes)
          await saveAlarmChange(writer, change, this.context(how.fromBacklog ?? false, recordingId));
        await learn(writer, view, one.point, usedMs);
      }
      const arrival = { arrivedMs: wallMs, usedMs, evaluated: !late };
      await noteArrival(writer, view.ids.pointId(machineId, pointId), arrival);
    });
  }

  /** One look at a trouble of a point, or of the site. */
  async look(
    trouble: TroubleSubject['trouble'],
    present: boolean,
    where: Partial<TroubleSubject> = {},
  ): Promise<void> {
    const subject = {
      kind: 'trouble',
      trouble,
      machineId: null,
      pointId: null,
      source: null,
      ...where,
    } as const;
    const look: TroubleLook = {
      present,
      usedMs: this.clock.wallMs(),
      reason: { detail: `${trouble} found` },
    };
    await this.ledger.transact(async (writer) => {
      const change = await lookAtTrouble(writer, subject, look);
      if (change !== null) await saveAlarmChange(writer, change, this.context());
    });
  }

  /** What a person does to an alarm by its number. */
  async command(number: number, kind: AlarmCommandName, reason: Record<string, unknown> = {}): Promise<void> {
    await this.ledger.transact(async (writer) => {
      const found = await alarmByNumber(writer, number);
      if (found === null) throw new Error(`no alarm ${number}`);
      const { subject, state } = found.alarm;
      const rule =
        subject.kind === 'trouble'
          ? troubleRule(subject.trouble)
          : this.view
              .point(`${subject.machineId}/${subject.pointId}`)
              ?.limits.find(({ id }) => id === subject.limitId);
      if (rule === undefined) throw new Error(`no limit for ${number}`);
      const change = changeOf(subject, state, alarmStep(state, { kind, comment: null, reason }, rule));
      if (change === null) throw new Error(`${kind} changes nothing`);
      await saveAlarmChange(writer, change, { ...this.context(), actor: 'K. Example', via: 'command' });
      const { key, machineId, pointId } = found.alarm;
      const { untilMs } = reason;
      if (typeof untilMs !== 'number') return;
      const held = { untilMs, by: 'K. Example', comment: 'until the repair' };
      const fromMs = this.clock.wallMs();
      if (kind === 'shelve') await setShelf(writer, key, { ...held, sinceMs: fromMs });
      else await putOutOfService(writer, { ...held, fromMs, machineId: machineId ?? 0, pointId });
    });
  }

  context(fromBacklog = false, recordingId: number | null = null): ChangeContext {
    return {
      ids: this.view.ids,
      wallMs: this.clock.wallMs(),
      recordingId,
      actor: 'service',
      via: 'service',
      fromBacklog,
    };
  }

  /** Time passes in steps, each with a round. */
  async pass(ms: number, stepMs = ms): Promise<void> {
    for (let passed = 0; passed < ms; passed += stepMs) {
      this.clock.advance(Math.min(stepMs, ms - passed));
      await this.rounds.round();
    }
  }
}

function benchSite(options: BenchOptions, folder: string): Site {
  const { site } = smallSite(options.tree ?? { blower: { de: ['overall'], nde: ['overall'] } });
  const all = { machines: null, areas: null, severities: null };
  const recipients = (options.to ?? [{ address: ann }, { address: ben }]).map((one) => ({
    address: ann,
    ...all,
    ...one,
  }));
  const server = {
    host: '127.0.0.1',
    port: options.port ?? 1,
    security: 'none',
    user: null,
    passwordFile: null,
  } as const;
  return {
    ...site,
    folders: { ...site.folders, data: folder },
    machines: site.machines.map((machine) => ({
      ...machine,
      ...options.machine,
      points: machine.points.map((point) => ({
        ...point,
        limits: point.limits.map((limit) => ({ ...limit, ...options.limit })),
      })),
    })),
    mail: {
      from: 'Humledger <humledger@larkfen.example>',
      server,
      secondServer: null,
      gatherMs: 5 * minuteMs,
      gatherDangerMs: 10_000,
      catchUpAfterMs: dayMs,
      // Off, so that a story is about one thing.
      reminders: { afterMs: null, thenTo: [], thenAfter: { reminders: 2 } },
      to: recipients,
      ...options.mail,
    },
    summary: { at: { hour: 6, minute: 30 }, to: recipients.slice(0, 1) },
  };
}
