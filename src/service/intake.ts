import type { DropFolder } from '../acquisition/drop-folder.ts';
import { printableName } from '../acquisition/file-name.ts';
import { type SeenFile, type Sweep, usualBounds } from '../acquisition/sweep.ts';
import { pointPath } from '../config/site.ts';
import type { WorkerPool } from '../manipulation/pool.ts';
import type { Ledger } from '../store/ledger.ts';
import { LedgerError } from '../store/ledger-error.ts';
import { Arrivals } from './arrivals.ts';
import { Backlog, isOld } from './backlog.ts';
import { inOrder } from './batches.ts';
import type { BeyondLedger } from './beyond-ledger.ts';
import type { Clock } from './clock.ts';
import { FileAway } from './file-away.ts';
import { FilingLog } from './filing-log.ts';
import type { KeptFiles } from './kept-files.ts';
import type { Complaints, Logger } from './log.ts';
import { PutAside } from './put-aside.ts';
import type { HeaderAnswer, HeaderTask, RecordingAnswer, RecordingTask } from './recording-task.ts';
import { startsOf } from './recording-time.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';
import { Strangers } from './strangers.ts';
import { TakeArchived } from './take-archived.ts';
import { TakeFiles } from './take-files.ts';
import type { ReadyRecording, Unassigned } from './verdicts.ts';

/**
 * Theory of operation of intake. One round:
 *
 *     finish pending filings -> take again what the ledger lacks -> sweep -> settle, look into headers -> hold a backlog -> order by start
 *        -> analyse in parallel, decide one after another (take-files.ts) -> file away
 *
 * 1. The sweep is the truth; the watcher only hints that a round is worth it.
 * 2. Nothing leaves the drop folder before its decision, and where it goes, is committed.
 * 3. Decisions are made in the order (start, source, hash), one transaction each; analysis runs ahead by a bounded
 *    number of files.
 * 4. A file whose attempt was noted and not ended is analysed alone at the next start; the second time it is
 *    quarantined.
 * 5. When the ledger cannot be written, files stay where they are, and the round says so and ends.
 *    A round takes for a while only: then the next one sweeps anew, and goes on with what was not begun.
 * 6. What leaves the drop folder is first noted beside the ledger (filing-log.ts). A ledger that was put back from a
 *    backup lacks what was noted since: that is taken again from the archive, in the old order and with the old times of
 *    arrival, before anything newer (take-archived.ts). What people did since is named, never done again (acts-log.ts).
 */
export interface IntakeTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly dropFolder: DropFolder;
  readonly pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly log: Logger;
  readonly complaints: Complaints;
  readonly step: Step;
  readonly kept: KeptFiles;
  /** What the ledger lacks; absent: nothing. */
  readonly beyond?: Pick<BeyondLedger, 'filingLog' | 'recordings'>;
}

export interface Round {
  readonly dropFolder: 'read' | 'missing' | 'unreadable';
  readonly taken: number;
  readonly setAside: number;
  /** Files that settle, wait for their backlog, or are to be tried again. */
  readonly waiting: number;
  /** Points (pointPath) that these files are for: their silence is not judged. Null: it may be any. */
  readonly waitingFor: ReadonlySet<string> | null;
  readonly unassigned: readonly Unassigned[];
  /** Orders of filing that something stands in the way of. */
  readonly unfiled: number;
  /** When the next round is worth it; null: when something arrives. */
  readonly againInMs: number | null;
}

const crowded = `more than ${usualBounds.mostFiles} files lie in the drop folder; the others are seen when these are gone`;

const nothing = { taken: 0, setAside: 0, waiting: 0, waitingFor: null, unassigned: [], unfiled: 0 };

/** How long until files that could not be taken for the ledger's sake are tried again. */
const retryMs = 5_000;

export class Intake {
  readonly #tools: IntakeTools;
  readonly #arrivals: Arrivals;
  readonly #backlog: Backlog;
  readonly #fileAway: FileAway;
  readonly #putAside: PutAside;
  readonly #take: TakeFiles;
  readonly #strangers: Strangers;
  readonly #archived: TakeArchived;
  #backlogRuns = false;
  #isStopping = false;

  constructor(tools: IntakeTools) {
    this.#tools = tools;
    const { clock, view } = tools;
    const forget = (path: string) => this.#arrivals.forget(path);
    this.#arrivals = new Arrivals({
      view,
      wallMs: () => clock.wallMs(),
      monotonicMs: () => clock.monotonicMs(),
      header: (task) => this.#header(task),
      isKept: (file) => this.#isKept(file),
      isStopping: () => this.#isStopping,
    });
    this.#backlog = new Backlog(() => clock.monotonicMs());
    const { filingLog, recordings: missing } = tools.beyond ?? {
      filingLog: new FilingLog(tools.ledger.folder),
      recordings: [],
    };
    this.#fileAway = new FileAway({ ...tools, filingLog, replaced: forget });
    this.#putAside = new PutAside({ ...tools, fileAway: this.#fileAway, forget });
    this.#take = new TakeFiles({
      ...tools,
      fileAway: this.#fileAway,
      putAside: this.#putAside,
      forget,
      isStopping: () => this.#isStopping,
    });
    this.#archived = new TakeArchived({ ...tools, take: this.#take, filingLog, missing });
    this.#backlogRuns = this.#archived.isOpen;
    this.#strangers = new Strangers(tools);
  }

  /** Old files are held back or being evaluated: what came and went among them is told when that is through. */
  get backlogRuns(): boolean {
    return this.#backlogRuns;
  }

  /** The round under way ends after what it has begun; what is left lies there for the next run. */
  askToStop(): void {
    this.#isStopping = true;
  }

  /** Before an orderly stop, between two rounds. */
  end(): Promise<void> {
    return this.#take.end();
  }

  /** `holdBacklog` false: what lies there is all there is (`run --once`). */
  async round(holdBacklog: boolean): Promise<Round> {
    try {
      const unfiled = await this.#fileAway.all();
      if (this.#archived.isOpen) {
        await this.#archived.all();
        if (this.#archived.isOpen) {
          const againInMs = this.#archived.isLetUp ? 0 : retryMs;
          return { ...nothing, unfiled, waiting: 1, dropFolder: 'read', againInMs };
        }
      }
      const sweep = await this.#tools.dropFolder.sweep((file) => this.#isKept(file));
      if (sweep.state !== 'read') {
        this.#tools.complaints.say('drop folder', sweep.reason);
        return { ...nothing, unfiled, dropFolder: sweep.state, againInMs: retryMs };
      }
      this.#tools.complaints.over('drop folder');
      if (sweep.cut) this.#tools.complaints.say('crowded', crowded);
      await this.#tools.kept.forgetGone(this.#tools.ledger);
      return await this.#roundOf(sweep, unfiled, holdBacklog);
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      this.#tools.complaints.say('ledger', `${error.message}; recordings stay in the drop folder`);
      return { ...nothing, waiting: 1, dropFolder: 'read', againInMs: retryMs };
    }
  }

  async #roundOf(
    sweep: Extract<Sweep, { state: 'read' }>,
    unfiledBefore: number,
    holdBacklog: boolean,
  ): Promise<Round> {
    for (const { path, reason } of sweep.leftAlone) {
      this.#tools.log.warn({ file: printableName(path) }, `left alone: ${reason}`);
    }
    const look = await this.#arrivals.look(sweep.files.filter((file) => !this.#fileAway.holds(file)));
    const { view: viewOf, clock } = this.#tools;
    if (this.#isStopping)
      return { ...nothing, waiting: 1, unfiled: unfiledBefore, dropFolder: 'read', againInMs: 0 };
    const view = viewOf();
    const starts = startsOf(view, look.ready);
    const startOf = (ready: ReadyRecording) => starts.get(ready) as number;
    const { now, held, againInMs } = this.#backlog.split(
      look.ready,
      holdBacklog ? (ready) => isOld(ready, startOf(ready)) : () => false,
      view.site.timings,
    );
    this.#backlogRuns = held.length > 0 || now.some((ready) => isOld(ready, startOf(ready)));
    const taken = await this.#take.recordings(inOrder(now, startOf), startOf);
    const { notBegun } = taken;
    this.#backlogRuns = held.length > 0 || notBegun.some((ready) => isOld(ready, startOf(ready)));
    const stay = [...held, ...(taken.left > 0 ? now : notBegun)];
    const setAside = await this.#putAside.givenUp(look.givenUp);
    const wallMs = clock.wallMs();
    const { unassigned, notRead } = look;
    const there = () => sweep.files.map(({ path }) => path);
    await this.#strangers.look(view, { wallMs, there, unassigned, notRead });
    const moved = await this.#unassigned(look.unassigned, view);
    const unfiled = taken.decided + setAside + moved > 0 ? await this.#fileAway.all() : unfiledBefore;
    return {
      dropFolder: 'read',
      taken: taken.decided,
      setAside: setAside + moved,
      waiting: look.waiting + held.length + taken.left + notBegun.length,
      waitingFor: new Set([...look.waitingFor, ...stay.flatMap(({ points }) => points)].map(pointPath)),
      unassigned: look.unassigned,
      unfiled,
      againInMs: soonest([
        look.againInMs,
        againInMs,
        taken.left + unfiled > 0 ? retryMs : null,
        notBegun.length > 0 && taken.left === 0 ? 0 : null,
      ]),
    };
  }

  #isKept(file: SeenFile): boolean {
    return this.#tools.view().site.folders.afterReading === 'keep' && this.#tools.kept.has(file);
  }

  async #header(task: HeaderTask): Promise<HeaderAnswer> {
    const answer = await this.#tools.pool.run(task);
    if (answer.outcome === 'answer') return answer.answer as HeaderAnswer;
    // A header that stops a worker twice would stop it again with its samples.
    if (answer.outcome === 'refused') {
      const reason = `reading its header stopped a worker: ${answer.reason}`;
      return { kind: 'refused', refusal: { refused: 'damaged', reason }, headIsZeros: false };
    }
    throw new Error(answer.reason);
  }

  /** Moves what lay there too long. */
  #unassigned(files: readonly Unassigned[], view: SiteView): Promise<number> {
    const { clock } = this.#tools;
    const tooOld = files.filter(({ arrivedMs, look }) => {
      const sinceMs = Math.min(arrivedMs, Math.max(look.mtimeMs, look.ctimeMs));
      return clock.wallMs() - sinceMs > view.site.timings.unassignedAfterMs;
    });
    return this.#putAside.unassigned(tooOld);
  }
}

function soonest(times: readonly (number | null)[]): number | null {
  const known = times.filter((time) => time !== null);
  return known.length === 0 ? null : Math.min(...known);
}
