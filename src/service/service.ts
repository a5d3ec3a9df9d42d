import { availableParallelism } from 'node:os';
import { extname } from 'node:path';
import { DropFolder } from '../acquisition/drop-folder.ts';
import { WorkerPool } from '../manipulation/pool.ts';
import type { Ledger } from '../store/ledger.ts';
import { isLedgerRefusal, LedgerError } from '../store/ledger-error.ts';
import { type OpenOptions, openLedger } from '../store/open-ledger.ts';
import { type BeyondLedger, lookBeyond, noteBeyond } from './beyond-ledger.ts';
import type { Clock } from './clock.ts';
import { HealthFile } from './health.ts';
import { Housekeeping } from './housekeeping.ts';
import { Intake, type Round } from './intake.ts';
import { KeptFiles } from './kept-files.ts';
import { Complaints, type Logger } from './log.ts';
import { type MailerFor, MailRounds } from './mail-rounds.ts';
import type { RecordingAnswer, RecordingTask } from './recording-task.ts';
import { noteStarted, noteStopped } from './run-marks.ts';
import { needsRestart, putInForce, readSiteFile, type SiteFile, tellWrongSiteFile } from './site-in-force.ts';
import type { SiteView } from './site-view.ts';
import { noStep, type Step } from './steps.ts';
import { WallSteps } from './wall-steps.ts';
import { Watches } from './watches.ts';

/**
 * The service: the only place that wires the blocks together. It does everything in rounds, so that the daemon
 * (run.ts: rounds on ticks), `run --once` (rounds until nothing is left) and the demo (rounds between steps of a
 * clock) are one and the same way.
 */
export interface ServiceOptions extends Pick<OpenOptions, 'largestPages' | 'migrations'> {
  readonly siteFile: SiteFile;
  readonly clock: Clock;
  readonly log: Logger;
  readonly step?: Step;
  /** Something may have come into the drop folder. */
  readonly hint?: () => void;
  readonly mailerFor?: MailerFor;
  readonly threads?: number;
  /** Module of the worker threads, and how long one task may take there. */
  readonly worker?: URL;
  readonly deadlineMs?: number;
  /** Called when no worker thread is left: the process should end and be started again. */
  readonly onLost?: (reason: string) => void;
}

/** Recordings are read in well under a minute; what takes longer hangs. */
const longestTaskMs = 300_000;

export class Service {
  readonly ledger: Ledger;
  readonly startedMs: number;
  readonly #options: ServiceOptions;
  readonly #complaints: Complaints;
  readonly #dropFolder: DropFolder;
  readonly #pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly #intake: Intake;
  readonly #mail: MailRounds;
  readonly #housekeeping: Housekeeping;
  readonly #health: HealthFile;
  readonly #watches: Watches;
  #view: SiteView;

  /** Opens the ledger as its owner and puts the site file in force; in words why not. */
  static async start(options: ServiceOptions): Promise<Service | { readonly refused: string }> {
    const { clock, siteFile } = options;
    const opened = await openLedger({
      folder: siteFile.site.folders.data,
      mode: 'owner',
      wallMs: () => Math.round(clock.wallMs()),
      monotonicMs: () => clock.monotonicMs(),
      step: options.step ?? noStep,
      ...(options.largestPages === undefined ? {} : { largestPages: options.largestPages }),
      ...(options.migrations === undefined ? {} : { migrations: options.migrations }),
    });
    if (isLedgerRefusal(opened)) return { refused: opened.reason };
    try {
      return await Service.#on(opened, options);
    } catch (error) {
      await opened.close();
      if (error instanceof LedgerError) return { refused: error.message };
      throw error;
    }
  }

  static async #on(ledger: Ledger, options: ServiceOptions): Promise<Service> {
    const { clock, siteFile, step = noStep } = options;
    const wallMs = Math.round(clock.wallMs());
    const view = await putInForce(ledger, siteFile, wallMs);
    const last = await noteStarted(ledger, view, wallMs);
    const kept = await KeptFiles.load(ledger, () => clock.monotonicMs());
    const beyond = await lookBeyond(ledger);
    const unclean = last === 'unclean';
    const service = new Service(options, { ledger, view, kept, beyond, unclean, startedMs: wallMs, step });
    await service.#mail.announce(last === 'none' ? 'first' : last, beyond);
    await noteBeyond(ledger, options.log, beyond);
    return service;
  }

  private constructor(
    options: ServiceOptions,
    parts: {
      ledger: Ledger;
      view: SiteView;
      kept: KeptFiles;
      beyond: BeyondLedger;
      unclean: boolean;
      startedMs: number;
      step: Step;
    },
  ) {
    const { clock, log } = options;
    const { ledger, kept, beyond } = parts;
    const monotonicMs = () => clock.monotonicMs();
    const view = () => this.#view;
    this.#options = options;
    this.#view = parts.view;
    this.ledger = ledger;
    this.startedMs = parts.startedMs;
    this.#complaints = new Complaints(log, monotonicMs);
    const { site } = parts.view;
    this.#dropFolder = new DropFolder({
      folder: site.folders.drop,
      except: [site.folders.data],
      polling: site.timings.polling,
      hint: options.hint ?? (() => {}),
    });
    this.#pool = new WorkerPool({
      worker: options.worker ?? workerUrl,
      threads: options.threads ?? Math.max(1, Math.min(4, availableParallelism())),
      deadlineMs: options.deadlineMs ?? longestTaskMs,
      onAllLost: (reason) => options.onLost?.(reason),
    });
    this.#health = new HealthFile(clock, this.#complaints);
    const step: Step = (name) => {
      parts.step(name);
      this.#health.alive();
    };
    const tools = { ledger, clock, view, log, complaints: this.#complaints, step };
    this.#watches = new Watches({ ...tools, wallSteps: new WallSteps(tools) });
    this.#intake = new Intake({ ...tools, dropFolder: this.#dropFolder, pool: this.#pool, kept, beyond });
    this.#mail = new MailRounds({
      ...tools,
      startedMs: parts.startedMs,
      backlogRuns: () => this.#intake.backlogRuns,
      ...(options.mailerFor ? { mailerFor: options.mailerFor } : {}),
    });
    const wallMs = () => clock.wallMs();
    this.#housekeeping = new Housekeeping({ ledger, view, log, monotonicMs, wallMs }, parts.unclean);
  }

  get view(): SiteView {
    return this.#view;
  }

  /** Takes what is ready, looks for silence, keeps house. `holdBacklog` false: what lies there is all there is. */
  async intakeRound(holdBacklog = true): Promise<Round> {
    await this.#watches.before();
    const round = await this.#intake.round(holdBacklog);
    this.#writeHealth(round);
    return this.#watches.after(round, () => this.#housekeeping.whenIdle());
  }

  /** A round under way ends soon, with what it has begun; rounds that follow begin nothing. */
  askToStop(): void {
    this.#intake.askToStop();
  }

  /** Composes and delivers what is due. `flush`: gathering is over, everything decided on leaves now. */
  mailRound(flush = false): ReturnType<MailRounds['round']> {
    return this.#mail.round(flush);
  }

  /** The morning summary, if it is due; its local date, or null. */
  morning(): Promise<string | null> {
    return this.#mail.morning();
  }

  /** Re-reads the site file: all of it or none. Returns what is wrong, or null. */
  async reload(): Promise<string | null> {
    const { clock, log } = this.#options;
    const read = readSiteFile(this.#view.site.file);
    const wallMs = Math.round(clock.wallMs());
    const problem =
      'problems' in read
        ? `${read.problems.length} problems, the first: ${read.problems[0]}`
        : needsRestart(this.#view.site, read.site);
    if (problem !== null || 'problems' in read) {
      log.error({ problem }, 'the site file stays as it was');
      await tellWrongSiteFile(this.ledger, this.#view, problem ?? '', wallMs);
      return problem;
    }
    await putInForce(this.ledger, read, wallMs, (view) => {
      this.#view = view;
    });
    log.info({ config_version: read.site.configVersion }, 'site file in force');
    return null;
  }

  /** Ends in the reverse order of the start; what is under way is finished. */
  async stop(): Promise<void> {
    await this.#dropFolder.close();
    await this.#pool.close();
    const wallMs = Math.round(this.#options.clock.wallMs());
    try {
      await this.#intake.end();
      await noteStopped(this.ledger, this.#view, wallMs);
    } catch (error) {
      // The next start takes it for an unclean stop, which does no harm.
      if (!(error instanceof LedgerError)) throw error;
      this.#complaints.say('ledger', error.message);
    } finally {
      await this.#housekeeping.end();
      await this.ledger.close();
    }
  }

  #writeHealth(round: Round): void {
    const { site } = this.#view;
    this.#health.write(site.folders.data, {
      pid: process.pid,
      startedMs: this.startedMs,
      configVersion: site.configVersion,
      dropFolder: round.dropFolder,
      filesWaiting: round.waiting,
      filesUnfiled: round.unfiled,
      unassigned: round.unassigned.slice(0, 20).map(({ path }) => path),
      unassignedCount: round.unassigned.length,
      workers: this.#pool.threads,
      walBytes: this.ledger.walBytes(),
      ledgerDamage: this.#housekeeping.damage,
    });
  }
}

/** The worker beside this file, in the form in which this file runs (source or built). */
const workerUrl = new URL(`./recording-worker${extname(import.meta.url)}`, import.meta.url);
