import { printableName } from '../acquisition/file-name.ts';
import type { WorkerPool } from '../manipulation/pool.ts';
import { endAttempt } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import { absolutePath } from './arrivals.ts';
import { attemptKey } from './batches.ts';
import type { Clock } from './clock.ts';
import type { FileAway } from './file-away.ts';
import type { FileLook } from './file-source.ts';
import type { Logger } from './log.ts';
import type { HashAnswer, RecordingAnswer, RecordingTask } from './recording-task.ts';
import { type AsideFile, decideAside } from './set-aside.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';
import type { GivenUp, ReadyRecording, Unassigned } from './verdicts.ts';

/** Decides on files that are no recordings: quarantine, or the folder of those that no point takes. */
export interface PutAsideTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly fileAway: FileAway;
  readonly forget: (path: string) => void;
  readonly log: Logger;
  readonly step: Step;
}

type FileAside = Pick<AsideFile, 'path' | 'source' | 'arrivedMs' | 'outcome' | 'trouble' | 'reason'> & {
  readonly sidecarPath: string | null;
};

export class PutAside {
  readonly #tools: PutAsideTools;

  constructor(tools: PutAsideTools) {
    this.#tools = tools;
  }

  async givenUp(files: readonly GivenUp[]): Promise<number> {
    let done = 0;
    for (const file of files) {
      const trouble = file.kind === 'late-sidecar' ? 'late-sidecar' : 'unreadable';
      if (await this.#one({ ...file, outcome: 'quarantined', trouble })) done++;
    }
    return done;
  }

  async unassigned(files: readonly Unassigned[]): Promise<number> {
    let done = 0;
    const reason = 'no point of the site file takes a file of this name';
    const same = { sidecarPath: null, source: null, reason, outcome: 'unassigned', trouble: null } as const;
    for (const { path, arrivedMs } of files) if (await this.#one({ path, arrivedMs, ...same })) done++;
    return done;
  }

  /** A recording that could not be read after all. False: it is gone. */
  async recording(ready: ReadyRecording, why: string): Promise<boolean> {
    const { path, sidecarPath, source, arrivedMs, header } = ready;
    const reason = `${printableName(path)}: ${why}`;
    const same = { outcome: 'quarantined', trouble: 'unreadable' } as const;
    if (await this.#one({ path, sidecarPath, source, arrivedMs, reason, ...same })) return true;
    await this.#tools.ledger.transact((writer) => endAttempt(writer, attemptKey(header.look)));
    this.#tools.forget(path);
    return false;
  }

  /** The sidecar of a recording that was taken without it, because of what stands in it. */
  async sidecar(ready: ReadyRecording): Promise<void> {
    const { sidecarPath, header, source, arrivedMs } = ready;
    if (sidecarPath === null || header.sidecarRefused === null) return;
    const reason = `${printableName(sidecarPath)}: ${header.sidecarRefused}`;
    const same = { sidecarPath: null, outcome: 'quarantined', trouble: 'late-sidecar' } as const;
    await this.#one({ path: sidecarPath, source, arrivedMs, reason, ...same });
  }

  /** False: gone, or not to be touched. */
  async #one(file: FileAside): Promise<boolean> {
    const { ledger, clock, view, fileAway, forget, log, step } = this.#tools;
    const hashed = await this.#hash(file.path);
    if (hashed === null) return false;
    const beside = file.sidecarPath === null ? null : await this.#hash(file.sidecarPath);
    const wallMs = Math.round(clock.wallMs());
    const aside: AsideFile = {
      ...file,
      look: hashed.look,
      sha256: hashed.sha256,
      sidecarSha256: beside?.sha256 ?? null,
      fileKey: attemptKey(hashed.look),
    };
    const recordingId = await ledger.transact((writer) => decideAside(writer, view(), aside, wallMs));
    fileAway.know(recordingId, {
      file: hashed.look,
      sidecar: beside === null || file.sidecarPath === null ? null : { path: file.sidecarPath, ...beside },
    });
    forget(file.path);
    step('intake: decision committed');
    log.warn({ file: printableName(file.path) }, `${file.outcome}: ${file.reason}`);
    return true;
  }

  /** Null: gone, or not to be touched. */
  async #hash(path: string): Promise<{ readonly look: FileLook; readonly sha256: string } | null> {
    const { site } = this.#tools.view();
    const answer = await this.#tools.pool.run({
      task: 'hash',
      path: absolutePath(site.folders.drop, path),
      largestBytes: Number.MAX_SAFE_INTEGER,
    });
    if (answer.outcome !== 'answer') return null;
    const hashed = answer.answer as HashAnswer;
    return hashed.kind === 'hashed' ? hashed : null;
  }
}
