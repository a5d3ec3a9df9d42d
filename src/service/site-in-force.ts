import { readFileSync } from 'node:fs';
import { formatProblems, loadSite } from '../config/load.ts';
import type { Site } from '../config/site.ts';
import type { AlarmRule } from '../detection/alarm-event.ts';
import { alarmStep } from '../detection/alarm-state.ts';
import { changeOf, type TroubleSubject } from '../detection/trouble.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Writer } from '../store/lent-connection.ts';
import { dropOtherPools } from '../store/pooling.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { type SiteIds, syncSite } from '../store/site-ids.ts';
import { lookAtTrouble } from './evaluate.ts';
import { type SiteView, siteView } from './site-view.ts';

/** A site file as it was read: what it means, and the text that the ledger keeps as the config version. */
export interface SiteFile {
  readonly site: Site;
  readonly text: string;
}

/** Reads a site file; or every problem, a line each. */
export function readSiteFile(path: string): SiteFile | { readonly problems: readonly string[] } {
  let text: string;
  try {
    text = readFileSync(path, 'utf8');
  } catch (error) {
    const missing = (error as NodeJS.ErrnoException).code === 'ENOENT';
    const what = missing ? 'there is no such file' : `cannot be read (${(error as Error).message})`;
    return { problems: [`${path}:1:1: ${what}; name the site file by --site FILE, or let draft write one`] };
  }
  const answer = loadSite(text, path);
  return answer.ok ? { site: answer.site, text } : { problems: formatProblems(path, answer.problems) };
}

const siteFileSubject: TroubleSubject = {
  kind: 'trouble',
  trouble: 'site-file',
  machineId: null,
  pointId: null,
  source: null,
};

/** What is gone can neither rise nor return; only that it is gone matters. */
const goneRule: AlarmRule = {
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching: false,
  sayAgainPercent: null,
};

/**
 * Puts a site file in force: in one transaction the ledger learns its machines, points, bands and limits, and what
 * stood for those that vanished is closed by `limit-removed`. `inForce` is called at the commit, before any other
 * transaction begins: what is decided in one is decided by the site file that the ledger holds then.
 */
export async function putInForce(
  ledger: Ledger,
  { site, text }: SiteFile,
  wallMs: number,
  inForce: (view: SiteView) => void = () => {},
): Promise<SiteView> {
  return await ledger.transact(async (writer, afterCommit) => {
    const synced = await syncSite(writer, site, { text, wallMs });
    for (const orphan of synced.orphans) {
      const step = alarmStep(orphan.state, { kind: 'limit-removed', comment: null, reason: {} }, goneRule);
      const change = changeOf(orphan.subject, orphan.state, step);
      if (change !== null) await saveAlarmChange(writer, change, contextOf(synced.ids, wallMs));
    }
    await tellSiteFile(writer, synced.ids, null, wallMs);
    const view = siteView(site, synced.ids);
    const pooling = view.points.filter(({ analysis }) => analysis.averageOver !== undefined);
    await dropOtherPools(
      writer,
      pooling.map((point) => synced.ids.pointId(point.machineId, point.id)),
    );
    afterCommit(() => inForce(view));
    return view;
  });
}

/** A site file that cannot be put in force leaves the old one, and is told. */
export async function tellWrongSiteFile(
  ledger: Ledger,
  view: SiteView,
  problem: string,
  wallMs: number,
): Promise<void> {
  await ledger.transact((writer) => tellSiteFile(writer, view.ids, problem, wallMs));
}

/** Null where the new site may take the old one's place while the service runs. */
export function needsRestart(before: Site, after: Site): string | null {
  if (before.folders.data !== after.folders.data)
    return 'the data folder is another one: restart the service for it';
  if (before.folders.drop !== after.folders.drop)
    return 'the drop folder is another one: restart the service for it';
  const listen = ({ page }: Site) => (page === null ? 'none' : `${page.host}:${page.port}`);
  return listen(before) === listen(after) ? null : 'the page listens elsewhere: restart the service for it';
}

async function tellSiteFile(
  writer: Writer,
  ids: SiteIds,
  problem: string | null,
  wallMs: number,
): Promise<void> {
  const change = await lookAtTrouble(writer, siteFileSubject, {
    present: problem !== null,
    usedMs: wallMs,
    reason: { detail: problem },
  });
  if (change !== null) await saveAlarmChange(writer, change, contextOf(ids, wallMs));
}

function contextOf(ids: SiteIds, wallMs: number) {
  return { ids, wallMs, recordingId: null, actor: 'service', via: 'service', fromBacklog: false } as const;
}
