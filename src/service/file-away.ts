import { nameOf, sidecarNameOf } from '../acquisition/file-name.ts';
import { completeFiling, type FilingOrder } from '../acquisition/filing.ts';
import type { SeenFile } from '../acquisition/sweep.ts';
import { writeMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import { markFiled, pendingFilings, type StoredRecording } from '../store/recordings.ts';
import type { Clock } from './clock.ts';
import type { FileLook } from './file-source.ts';
import { type FilingLog, filingsMark } from './filing-log.ts';
import type { Complaints, Logger } from './log.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';

/**
 * Takes decided files out of the drop folder. Each order stands in the ledger as 'pending' until it is carried out, so
 * what was interrupted is found again here, at start and in every round.
 */
export interface FileAwayTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly filingLog: FilingLog;
  readonly view: () => SiteView;
  readonly log: Logger;
  readonly complaints: Complaints;
  readonly step: Step;
  /** Another file came under the name: it settles as a new arrival. */
  readonly replaced: (path: string) => void;
}

/** What this run knows of a file beyond the ledger: then it need not be hashed again. */
export interface KnownLooks {
  readonly file: FileLook;
  readonly sidecar: { readonly path: string; readonly sha256: string; readonly look: FileLook } | null;
}

const ordersAtOnce = 50;

export class FileAway {
  readonly #tools: FileAwayTools;
  readonly #known = new Map<number, KnownLooks>();
  /** Files whose order something stands in the way of, by path; with the inode that was read, where this run read it. */
  readonly #stuck = new Map<string, string | null>();

  constructor(tools: FileAwayTools) {
    this.#tools = tools;
  }

  /** Remembers what was seen of the file of a recording decided in this run. */
  know(recordingId: number, looks: KnownLooks): void {
    this.#known.set(recordingId, looks);
  }

  /** True for a file that is decided on and only could not be moved yet: it is no new arrival. */
  holds({ path, dev, ino }: Pick<SeenFile, 'path' | 'dev' | 'ino'>): boolean {
    const inode = this.#stuck.get(path);
    return inode === null || inode === `${dev}:${ino}`;
  }

  /** Carries out every standing order; returns how many are left, because something stands in the way. */
  async all(): Promise<number> {
    this.#stuck.clear();
    let left = 0;
    for (let afterId = 0; ; ) {
      const orders = await this.#tools.ledger.read((reader) => pendingFilings(reader, ordersAtOnce, afterId));
      const last = orders.at(-1);
      if (last === undefined) return left;
      afterId = last.id;
      this.#note(orders);
      const filed: { readonly id: number; readonly to: string | null }[] = [];
      for (const order of orders) {
        const to = await this.#one(order);
        if (to !== false) filed.push({ id: order.id, to });
      }
      if (filed.length > 0) await this.#commit(filed);
      left += orders.length - filed.length;
    }
  }

  /** Where the file went (null: nowhere, deleted or gone); false: it could not be moved. */
  async #one(recording: StoredRecording): Promise<string | null | false> {
    const { log, complaints, step, replaced } = this.#tools;
    const outcome = await completeFiling(this.#order(recording), { step });
    if (outcome.outcome === 'cannot') {
      complaints.say('filing', outcome.reason);
      this.#holdBack(recording);
      return false;
    }
    complaints.over('filing');
    if (outcome.outcome === 'replaced') replaced(recording.filingFrom);
    if (outcome.outcome === 'gone')
      log.warn({ file: recording.filingFrom }, 'taken, but gone before it could be filed');
    return outcome.outcome === 'filed' ? outcome.to : null;
  }

  /** Before a file is touched; a log that cannot be written holds nothing up. */
  #note(orders: readonly StoredRecording[]): void {
    try {
      this.#tools.filingLog.note(orders, this.#tools.clock.wallMs());
      this.#tools.complaints.over('filing log');
    } catch (error) {
      this.#tools.complaints.say(
        'filing log',
        `the log of filings cannot be written: ${(error as Error).message}`,
      );
    }
    this.#tools.step('intake: filing noted');
  }

  /** One transaction for several files: an order that is carried out twice ends the same. */
  async #commit(filed: readonly { readonly id: number; readonly to: string | null }[]): Promise<void> {
    const { filingLog } = this.#tools;
    await this.#tools.ledger.transact(async (writer) => {
      for (const { id, to } of filed) await markFiled(writer, id, to);
      if (filingLog.settled && filingLog.mark !== null) await writeMark(writer, filingsMark, filingLog.mark);
    });
    for (const { id } of filed) this.#known.delete(id);
    filingLog.forget(filed.map(({ id }) => id));
    this.#tools.step('intake: filing committed');
  }

  #holdBack(recording: StoredRecording): void {
    const known = this.#known.get(recording.id);
    const inode = ({ dev, ino }: FileLook) => `${dev}:${ino}`;
    this.#stuck.set(recording.filingFrom, known === undefined ? null : inode(known.file));
    const sidecar = sidecarOf(recording, known);
    if (sidecar !== null)
      this.#stuck.set(sidecar.from, known?.sidecar == null ? null : inode(known.sidecar.look));
  }

  #order(recording: StoredRecording): FilingOrder {
    const { folders } = this.#tools.view().site;
    const known = this.#known.get(recording.id);
    return {
      from: recording.filingFrom,
      sha256: recording.contentSha256,
      look: known?.file ?? null,
      dropFolder: folders.drop,
      dataFolder: folders.data,
      to: recording.filingTo,
      reason:
        recording.outcome === 'quarantined' || recording.outcome === 'unassigned' ? recording.reason : null,
      sidecar: sidecarOf(recording, known),
    };
  }
}

function sidecarOf(recording: StoredRecording, known: KnownLooks | undefined): FilingOrder['sidecar'] {
  if (known !== undefined) {
    return known.sidecar === null
      ? null
      : { from: known.sidecar.path, sha256: known.sidecar.sha256, look: known.sidecar.look };
  }
  if (recording.sidecarSha256 === null) return null;
  const { filingFrom } = recording;
  const folder = filingFrom.slice(0, filingFrom.length - nameOf(filingFrom).length);
  return { from: folder + sidecarNameOf(nameOf(filingFrom)), sha256: recording.sidecarSha256, look: null };
}
