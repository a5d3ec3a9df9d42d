import { printableName } from '../acquisition/file-name.ts';
import type { AlarmChange } from '../detection/alarm.ts';
import { type TroubleSubject, troubleStep } from '../detection/trouble.ts';
import { standingAlarms } from '../store/alarms.ts';
import { tellOnce } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import { lookAtTrouble, sourceTrouble } from './evaluate.ts';
import type { Logger } from './log.ts';
import { namePattern } from './set-aside.ts';
import type { SiteView } from './site-view.ts';
import type { NotRead, Unassigned } from './verdicts.ts';

/**
 * Files in the drop folder that belong to nobody or cannot be opened: each kind of name is told once, as a trouble
 * that is over when no such file lies there any more. Troubles that no good recording can end (names that cannot be
 * used, sidecars without a recording, sources that the site file no longer has) are over after a day without another.
 */
export interface StrangersLook {
  readonly wallMs: number;
  /** Paths of all files that lie there, those that still settle among them. */
  readonly there: () => readonly string[];
  readonly unassigned: readonly Unassigned[];
  readonly notRead: readonly NotRead[];
}

const overAfterMs = 86_400_000;
/** Names of one kind are read off their digits; a folder of random names is one kind more. */
const mostKinds = 200;
const manyKinds = 'names of many kinds';

export class Strangers {
  readonly #ledger: Ledger;
  readonly #log: Logger;
  /** Told in this run, so that a look that finds nothing new takes no transaction. */
  readonly #told = new Set<string>();

  constructor({ ledger, log }: { readonly ledger: Ledger; readonly log: Logger }) {
    this.#ledger = ledger;
    this.#log = log;
  }

  async look(view: SiteView, look: StrangersLook): Promise<void> {
    const kinds = kindsOf(look.unassigned);
    for (const [kind, path] of kinds) await this.#tell(view, kind, path, look.wallMs);
    for (const file of look.notRead) await this.#tellNotRead(view, file, look.wallMs);
    await this.#end(view, look);
  }

  async #tell(view: SiteView, kind: string, path: string, wallMs: number): Promise<void> {
    if (this.#told.has(kind)) return;
    const isNews = await this.#ledger.transact(async (writer) => {
      if (!(await tellOnce(writer, `unassigned ${kind}`, Math.round(wallMs)))) return false;
      await raise(writer, view, sourceTrouble('unassigned', kind), wallMs, { file: path });
      return true;
    });
    this.#told.add(kind);
    if (isNews)
      this.#log.warn(
        { file: printableName(path) },
        'no point of the site file takes this file; see the command files',
      );
  }

  async #tellNotRead(view: SiteView, { path, source, reason }: NotRead, wallMs: number): Promise<void> {
    const key = `${path}\n${reason}`;
    if (this.#told.has(key)) return;
    const subject = sourceTrouble('unreadable', source);
    await this.#ledger.transact((writer) =>
      raise(writer, view, subject, wallMs, { file: path, detail: reason }),
    );
    this.#told.add(key);
    this.#log.warn({ file: printableName(path) }, `not read: ${reason}`);
  }

  async #end(view: SiteView, look: StrangersLook): Promise<void> {
    const { wallMs } = look;
    const foreseen = await this.#ledger.read((reader) => endings(reader, view, look));
    if (foreseen.length === 0) return;
    await this.#ledger.transact(async (writer) => {
      for (const change of await endings(writer, view, look))
        await saveAlarmChange(writer, change, contextOf(view, wallMs));
    });
  }
}

/** Each kind of name with one file of it. */
function kindsOf(files: readonly Unassigned[]): Map<string, string> {
  const kinds = new Map<string, string>();
  for (const { path } of files) {
    const kind = namePattern(path);
    if (kinds.has(kind)) continue;
    kinds.set(kinds.size < mostKinds ? kind : manyKinds, path);
  }
  return kinds;
}

function kindsThere(paths: readonly string[]): Set<string> {
  const kinds = new Set(paths.map(namePattern));
  if (kinds.size > mostKinds) kinds.add(manyKinds);
  return kinds;
}

async function endings(reader: Reader, view: SiteView, look: StrangersLook): Promise<AlarmChange[]> {
  const { wallMs, there } = look;
  const sources = new Set(view.files.sources.map(({ source }) => source));
  let kinds: ReadonlySet<string> | null = null;
  const changes: AlarmChange[] = [];
  for (const { alarm } of await standingAlarms(reader)) {
    const { subject, state } = alarm;
    if (subject.kind !== 'trouble' || state.condition !== 'trouble') continue;
    const isOld = wallMs - (state.usedMs ?? 0) > overAfterMs;
    if (subject.trouble === 'unassigned') kinds ??= kindsThere(there());
    const isOver =
      (subject.trouble === 'unassigned' && kinds?.has(subject.source ?? '') === false) ||
      (subject.trouble === 'late-sidecar' && isOld) ||
      (subject.trouble === 'unreadable' && subject.source !== null && !sources.has(subject.source) && isOld);
    if (!isOver) continue;
    const change = troubleStep(subject, state, { present: false, usedMs: Math.round(wallMs), reason: {} });
    if (change !== null) changes.push(change);
  }
  return changes;
}

async function raise(
  writer: Writer,
  view: SiteView,
  subject: TroubleSubject,
  wallMs: number,
  reason: Record<string, unknown>,
): Promise<void> {
  const change = await lookAtTrouble(writer, subject, { present: true, usedMs: Math.round(wallMs), reason });
  if (change !== null) await saveAlarmChange(writer, change, contextOf(view, wallMs));
}

function contextOf(view: SiteView, wallMs: number): ChangeContext {
  return {
    ids: view.ids,
    wallMs: Math.round(wallMs),
    recordingId: null,
    actor: 'service',
    via: 'service',
    fromBacklog: false,
  };
}
