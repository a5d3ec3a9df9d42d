import { printableName } from '../acquisition/file-name.ts';
import { pointPath } from '../config/site.ts';
import type { WorkerPool } from '../manipulation/pool.ts';
import { beginAttempt, endAttempt, unfinishedAttempts } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import { LedgerError } from '../store/ledger-error.ts';
import {
  type Analysed,
  attemptKey,
  batches,
  byHash,
  isSuspect,
  newestBySource,
  type StartOf,
  sameStart,
  type Taken,
} from './batches.ts';
import type { Clock } from './clock.ts';
import { decide } from './decide.ts';
import { type ChosenBands, chosenBandsOf } from './envelope-choices.ts';
import type { FileAway } from './file-away.ts';
import type { FileLook } from './file-source.ts';
import type { KeptFiles } from './kept-files.ts';
import type { Complaints, Logger } from './log.ts';
import { measureTask } from './measure-task.ts';
import type { PutAside } from './put-aside.ts';
import type { MeasureAnswer, RecordingAnswer, RecordingTask } from './recording-task.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';
import { looksOf } from './taken-file.ts';
import type { ReadyRecording } from './verdicts.ts';

/** Analysis in parallel, decisions one after another. */
export interface TakeTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly fileAway: FileAway;
  readonly putAside: PutAside;
  readonly forget: (path: string) => void;
  readonly log: Logger;
  readonly complaints: Complaints;
  readonly step: Step;
  readonly kept: KeptFiles;
  /** The service was asked to stop: nothing more is begun. */
  readonly isStopping: () => boolean;
}

/** So long a round takes recordings; what came meanwhile is seen by the next one. */
const longestTakingMs = 20_000;

/** Files of a batch, a worker; two batches are under way at a time. */
const waitingPerWorker = 2;

export class TakeFiles {
  readonly #tools: TakeTools;
  /** Files whose analysis was begun in an earlier run and not ended: they may have stopped it. */
  #suspects: Map<string, number> | null = null;
  /** Attempts of this run whose analysis has ended, and whose decision could not be written yet. */
  readonly #answered = new Set<string>();

  constructor(tools: TakeTools) {
    this.#tools = tools;
  }

  /** Takes recordings in their order, for a while. */
  async recordings(ready: readonly ReadyRecording[], startOf: StartOf): Promise<Taken> {
    if (ready.length === 0) return { decided: 0, left: 0, notBegun: [] };
    const beganMs = this.#tools.clock.monotonicMs();
    const suspects = await this.#suspectsOf();
    const newest = newestBySource(ready, startOf);
    let decided = 0;
    const held = new Set<string>();
    const waiting = [...batches(ready, suspects, this.#tools.pool.threads * waitingPerWorker)];
    let next = this.#mayBegin(waiting[0], beganMs) ? await this.#start(waiting.shift()) : null;
    while (next !== null) {
      const now = next;
      // The next batch is analysed while this one is decided; a file that stopped the service is read alone.
      const ahead = waiting[0];
      const apart = isSuspect(ahead?.[0], suspects) || isSuspect(now.files[0], suspects);
      next = !apart && this.#mayBegin(ahead, beganMs) ? await this.#start(waiting.shift()) : null;
      for (const group of sameStart(now.files, startOf)) {
        const analysed = await Promise.all(group.map((index) => now.running[index] as Promise<Analysed>));
        for (const one of analysed.sort(byHash)) {
          if (one.ready.points.some((point) => held.has(pointPath(point)))) continue;
          if (await this.#decide(one, newest.get(one.ready.source) as number)) decided++;
          else for (const point of one.ready.points) held.add(pointPath(point));
        }
      }
      if (next === null && this.#mayBegin(waiting[0], beganMs)) next = await this.#start(waiting.shift());
    }
    const notBegun = waiting.flat();
    return { decided, left: held.size === 0 ? 0 : ready.length - notBegun.length - decided, notBegun };
  }

  /** No batch is begun by a site file that is no longer in force: its points may be others. */
  #mayBegin(batch: readonly ReadyRecording[] | undefined, beganMs: number): boolean {
    const { clock, view, isStopping } = this.#tools;
    if (batch === undefined || isStopping() || batch.some((ready) => ready.view !== view())) return false;
    return clock.monotonicMs() - beganMs < longestTakingMs;
  }

  /** Before an orderly stop: what was analysed did not stop the service, although it could not be decided on. */
  async end(): Promise<void> {
    if (this.#answered.size === 0) return;
    await this.#tools.ledger.transact(async (writer) => {
      for (const fileKey of this.#answered) await endAttempt(writer, fileKey);
    });
  }

  /** Notes the attempts of a batch and sets its analysis going. */
  async #start(batch: readonly ReadyRecording[] | undefined) {
    if (batch === undefined) return null;
    const files = await this.#begin(batch);
    const chosenBandOf = await chosenBandsOf(this.#tools.ledger, files);
    return { files, running: files.map((one) => this.#analyse(one, chosenBandOf)) };
  }

  async #suspectsOf(): Promise<ReadonlyMap<string, number>> {
    if (this.#suspects === null) {
      const attempts = await this.#tools.ledger.read((reader) => unfinishedAttempts(reader));
      this.#suspects = new Map(attempts.map(({ fileKey, unfinished }) => [fileKey, unfinished]));
    }
    return this.#suspects;
  }

  /** Notes the attempts; a file that stopped the service twice is not tried a third time. */
  async #begin(files: readonly ReadyRecording[]): Promise<ReadyRecording[]> {
    const { ledger, clock, step } = this.#tools;
    const suspects = await this.#suspectsOf();
    const poison = files.filter((file) => (suspects.get(attemptKey(file.header.look)) ?? 0) >= 2);
    for (const file of poison) await this.#setAside(file, 'stopped the service twice while it was read');
    const good = files.filter((file) => !poison.includes(file));
    if (good.length === 0) return [];
    const begunMs = Math.round(clock.wallMs());
    const unnoted = good
      .map(({ path, header }) => ({ fileKey: attemptKey(header.look), fileName: path, begunMs }))
      .filter(({ fileKey }) => !this.#answered.has(fileKey));
    if (unnoted.length > 0)
      await ledger.transact(async (writer) => {
        for (const attempt of unnoted) await beginAttempt(writer, attempt);
      });
    step('intake: attempt noted');
    return good;
  }

  async #analyse(ready: ReadyRecording, chosenBandOf: ChosenBands): Promise<Analysed> {
    const answer = await this.#tools.pool.run(measureTask(ready, chosenBandOf));
    if (answer.outcome !== 'no-worker') this.#answered.add(attemptKey(ready.header.look));
    if (answer.outcome === 'answer') return { ready, answer: answer.answer as MeasureAnswer };
    const kind = answer.outcome === 'refused' ? 'stopped' : answer.outcome;
    return { ready, answer: { kind, reason: answer.reason } };
  }

  /** False: the file stays where it is, to be tried again. */
  async #decide(analysed: Analysed, batchNewestStatedMs: number): Promise<boolean> {
    const { complaints, step } = this.#tools;
    const { ready } = analysed;
    step('intake: recording read');
    try {
      const decided = await this.#conclude(analysed, batchNewestStatedMs);
      this.#answered.delete(attemptKey(ready.header.look));
      complaints.over('ledger');
      return decided;
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      complaints.say('ledger', `${error.message}; ${printableName(ready.path)} stays in the drop folder`);
      return false;
    }
  }

  async #conclude({ ready, answer }: Analysed, batchNewestStatedMs: number): Promise<boolean> {
    if (answer.kind === 'no-worker') throw new Error(answer.reason);
    if (answer.kind === 'changed' || answer.kind === 'gone') return await this.#lookAgain(ready);
    if (answer.kind === 'refused') return await this.#setAside(ready, answer.refusal.reason);
    if (answer.kind === 'stopped')
      return await this.#setAside(ready, `reading it stopped a worker: ${answer.reason}`);
    return (await this.#take(ready, answer, batchNewestStatedMs)) || (await this.#lookAgain(ready));
  }

  /** One that was filed before stays in the archive. */
  async #setAside(ready: ReadyRecording, why: string): Promise<boolean> {
    if (ready.archived === null) return this.#tools.putAside.recording(ready, why);
    this.#tools.log.error({ file: ready.archived }, `not taken again: ${why}`);
    return this.#lookAgain(ready);
  }

  /** The file settles and is looked into anew. */
  async #lookAgain({ path, header }: ReadyRecording): Promise<true> {
    await this.#tools.ledger.transact((writer) => endAttempt(writer, attemptKey(header.look)));
    this.#tools.forget(path);
    return true;
  }

  /** False: another site file came into force meanwhile, and the points may be others. */
  async #take(
    ready: ReadyRecording,
    answer: Extract<MeasureAnswer, { kind: 'measured' }>,
    batchNewestStatedMs: number,
  ): Promise<boolean> {
    const { ledger, clock, putAside, step, log } = this.#tools;
    step('intake: decision begun');
    const wallMs = Math.round(clock.wallMs());
    const fileKey = attemptKey(ready.header.look);
    const { path, view, archived } = ready;
    // A reload may have been waiting for the ledger before this, so it is asked for within the transaction.
    const decided = await ledger.transact(async (writer) =>
      view === this.#tools.view()
        ? decide(writer, view, { ready, answer, fileKey, batchNewestStatedMs }, wallMs)
        : null,
    );
    if (decided === null) return false;
    if (archived === null) this.#remember(ready, answer, decided.recordingId);
    step('intake: decision committed');
    log.debug({ file: path, outcome: decided.outcome }, 'recording in the ledger');
    if (archived === null) await putAside.sidecar(ready);
    return true;
  }

  /** What this run knows of a file that is to leave the drop folder, or to stay there. */
  #remember(ready: ReadyRecording, { look }: { readonly look: FileLook }, recordingId: number): void {
    const { fileAway, forget, kept } = this.#tools;
    const { path, sidecarPath, view } = ready;
    forget(path);
    if (view.site.folders.afterReading === 'keep') {
      for (const one of looksOf(ready, look)) kept.add(one);
      return;
    }
    const { sidecar } = ready.header;
    fileAway.know(recordingId, {
      file: look,
      sidecar:
        sidecar === null || sidecarPath === null
          ? null
          : { path: sidecarPath, sha256: sidecar.sha256, look: sidecar.look },
    });
  }
}
