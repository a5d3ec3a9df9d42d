import type { DropFolder } from '../../src/acquisition/drop-folder.ts';
import type { RecordingHeader } from '../../src/acquisition/recording.ts';
import type { SeenFile, Sweep } from '../../src/acquisition/sweep.ts';
import type { WorkerPool } from '../../src/manipulation/pool.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import type { FileLook } from '../../src/service/file-source.ts';
import { Intake, type Round } from '../../src/service/intake.ts';
import { KeptFiles } from '../../src/service/kept-files.ts';
import { Complaints, createLog } from '../../src/service/log.ts';
import type { RecordingAnswer, RecordingTask } from '../../src/service/recording-task.ts';
import { putInForce } from '../../src/service/site-in-force.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { measurementOf } from '../store/small-site.ts';
import { opened } from '../store/temporary-ledger.ts';
import { beginMs, type SiteOnDisk } from './site-on-disk.ts';

/** A recording without samples: what its analysis would say. */
export interface SimulatedFile {
  readonly name: string;
  /** Files of equal content are equal files. */
  readonly content: string;
  /** m/s2 r.m.s. in its band. */
  readonly level: number;
}

/**
 * The real intake, decisions and ledger over a drop folder and an analysis that are simulated, so that thousands of
 * arrivals can be played. Times of change are those of the service's wall clock.
 */
export class SimulatedDrop {
  readonly clock = new SteppedClock(beginMs);
  readonly ledger: Ledger;
  readonly #intake: Intake;
  readonly #files = new Map<string, SimulatedFile & { readonly look: FileLook }>();
  #inode = 1;

  static async on(site: SiteOnDisk): Promise<SimulatedDrop> {
    const ledger = await opened(site.data, { wait: async () => {} });
    const view = await putInForce(ledger, site.siteFile, beginMs);
    return new SimulatedDrop(ledger, view, await KeptFiles.load(ledger, () => 0));
  }

  private constructor(ledger: Ledger, view: Awaited<ReturnType<typeof putInForce>>, kept: KeptFiles) {
    this.ledger = ledger;
    const log = createLog({ write: () => {} });
    this.#intake = new Intake({
      ledger,
      clock: this.clock,
      view: () => view,
      dropFolder: { sweep: async () => this.#sweep() } as unknown as DropFolder,
      pool: {
        threads: 4,
        run: async (task: RecordingTask) => ({ outcome: 'answer', answer: this.#answer(task) }),
      } as unknown as WorkerPool<RecordingTask, RecordingAnswer>,
      log,
      complaints: new Complaints(log, () => this.clock.monotonicMs()),
      step: () => {},
      kept,
    });
  }

  drop(file: SimulatedFile): void {
    const at = this.clock.wallMs();
    const look = { dev: 1, ino: this.#inode++, size: 1000, mtimeMs: at, ctimeMs: at };
    this.#files.set(file.name, { ...file, look });
  }

  async after(ms: number): Promise<Round> {
    this.clock.advance(ms);
    return this.#intake.round(true);
  }

  /** Goes on until nothing settles or waits for its batch any more. */
  async untilTaken(): Promise<void> {
    for (let rounds = 0; rounds < 40; rounds++) {
      const { waiting, againInMs } = await this.after(0);
      if (waiting === 0) return;
      this.clock.advance(againInMs ?? 1000);
    }
    throw new Error('files wait without end');
  }

  #sweep(): Sweep {
    const files = [...this.#files.values()].map(
      ({ name, look }): SeenFile => ({ path: name, nameProblem: null, ...look }),
    );
    files.sort((a, b) => (a.path < b.path ? -1 : 1));
    return { state: 'read', files, leftAlone: [], setAside: [], cut: false, folderInode: '1:1' };
  }

  #answer(task: RecordingTask): RecordingAnswer {
    const name = String(task.path).slice(String(task.path).lastIndexOf('/') + 1);
    const file = this.#files.get(name);
    if (file === undefined) return { kind: 'gone' };
    const { look } = file;
    if (task.task === 'hash') return { kind: 'hashed', look, sha256: sha(file.content) };
    if (task.task === 'header')
      return { kind: 'header', look, header, sidecar: null, sidecarRefused: null, zeroTail: false };
    // Decided on once it is measured: with after_reading: delete nothing is left of it.
    this.#files.delete(name);
    return {
      kind: 'measured',
      look,
      sha256: sha(file.content),
      header,
      measurements: task.points.map(({ point }) =>
        measurementOf(point.machineId, point.id, { overall: file.level }),
      ),
      missing: [],
      quality: [],
      frames: 512,
      sampleRateHz: 2560,
    };
  }
}

const header: RecordingHeader = {
  format: 'simulated',
  sampleRateHz: 2560,
  channelNames: ['1', '2'],
  channelUnits: [null, null],
  samples: 'integer',
  framesClaimed: 512,
  complete: true,
  start: null,
  remarks: [],
};

function sha(content: string): string {
  return content.padEnd(64, '0');
}
