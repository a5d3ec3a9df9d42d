import { localDate } from '../config/local-time.ts';
import { quickCheck } from '../store/backup.ts';
import type { Ledger } from '../store/ledger.ts';
import { whatToDoWithDamage } from '../store/ledger-error.ts';
import { emptyOldMail } from '../store/old-mail.ts';
import { newestSpectraKept } from '../store/retention.ts';
import { giveBackPages, thinSpectraOfPoint } from '../store/thinning.ts';
import type { Logger } from './log.ts';
import type { SiteView } from './site-view.ts';

/** Work for quiet moments. All waits are on the monotonic clock; what it does never holds up intake for long. */
export interface HousekeepingTools {
  readonly ledger: Ledger;
  readonly view: () => SiteView;
  readonly log: Logger;
  readonly monotonicMs: () => number;
  readonly wallMs: () => number;
}

const hourMs = 3_600_000;
const mailKeptMs = 90 * 24 * hourMs;
const summaryKeptMs = 366 * 24 * hourMs;
const checkpointAboveBytes = 4 * 1024 * 1024;
/** Kept for what comes next, so that the file does not shrink and grow with every recording (16 MiB). */
const pagesKept = 4096;

export class Housekeeping {
  readonly #tools: HousekeepingTools;
  #thinnedMs: number;
  #checkedMs: number;
  #checking: Promise<void> | null = null;
  readonly #ended = new AbortController();
  /** What the last quick check found; null: sound, or not checked yet. */
  damage: string | null = null;

  /** `checkNow`: the last run did not stop cleanly. */
  constructor(tools: HousekeepingTools, checkNow: boolean) {
    this.#tools = tools;
    this.#thinnedMs = tools.monotonicMs();
    this.#checkedMs = checkNow ? Number.NEGATIVE_INFINITY : tools.monotonicMs();
  }

  /** To be called when nothing waits. */
  async whenIdle(): Promise<void> {
    const { ledger, monotonicMs } = this.#tools;
    const nowMs = monotonicMs();
    if (ledger.walBytes() > checkpointAboveBytes) await ledger.checkpoint();
    if (nowMs - this.#checkedMs >= 24 * hourMs && this.#checking === null) this.#check(nowMs);
    if (nowMs - this.#thinnedMs < hourMs) return;
    this.#thinnedMs = nowMs;
    await this.thin();
  }

  async thin(): Promise<void> {
    const { ledger, view, log } = this.#tools;
    const { points, ids, site } = view();
    const spectra = {
      newest: newestSpectraKept,
      dayOf: (usedMs: number) => localDate(usedMs, site.timeZone),
    };
    const between = () => new Promise<void>((resolve) => setImmediate(resolve));
    let removed = 0;
    for (const point of points)
      removed += await thinSpectraOfPoint(ledger, ids.pointId(point.machineId, point.id), spectra, between);
    const wallMs = this.#tools.wallMs();
    const rule = { mailBeforeMs: wallMs - mailKeptMs, summaryBeforeMs: wallMs - summaryKeptMs };
    const emptied = await emptyOldMail(ledger, rule, between);
    if (removed + emptied === 0) return;
    await giveBackPages(ledger, pagesKept, between);
    log.debug({ spectra: removed, mails: emptied }, 'ledger thinned');
  }

  /** A check under way is given up. */
  async end(): Promise<void> {
    this.#ended.abort();
    await this.#checking;
  }

  /** In a process with its own connection; the service is ready meanwhile. */
  #check(nowMs: number): void {
    this.#checkedMs = nowMs;
    const { ledger, log } = this.#tools;
    this.#checking = quickCheck(ledger.path, this.#ended.signal)
      .then((found) => {
        this.damage = 'refused' in found ? found.reason : (found[0] ?? null);
        if (this.damage !== null)
          log.error({ found: this.damage }, `the ledger fails its check; ${whatToDoWithDamage}`);
      })
      // A process that could not be started says nothing of the ledger, and is no reason to end.
      .catch((error: unknown) => {
        if (!this.#ended.signal.aborted)
          log.error({ error: String(error) }, 'the ledger could not be checked');
      })
      .finally(() => {
        this.#checking = null;
      });
  }
}
