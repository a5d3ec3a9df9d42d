import { statSync } from 'node:fs';
import type { MailServer, Site } from '../../config/site.ts';
import { readHealth } from '../../service/health.ts';
import type { SiteFile } from '../../service/site-in-force.ts';
import type { Ledger } from '../../store/ledger.ts';
import { isLedgerRefusal, LedgerError } from '../../store/ledger-error.ts';
import { openLedger } from '../../store/open-ledger.ts';
import { isOwned } from '../../store/owner-lock.ts';
import { readSiteIds } from '../../store/site-ids.ts';
import { type DropLook, lookAtDrop } from './drop-look.ts';
import { FileLevels } from './file-levels.ts';
import { type LedgerPoint, lookUpPoint } from './ledger-look.ts';
import { checkPoint, type PointCheck } from './point-check.ts';
import { RecordingAdviser } from './recording-advice.ts';
import { nothingRetired, type Retired, recipientsOf, retiredBy } from './retired.ts';

/** Everything that `check` says of a site file that is sound. */
export interface SiteCheck {
  readonly site: Site;
  readonly drop: DropLook;
  readonly points: readonly PointCheck[];
  readonly retired: Retired;
  /** There is no ledger yet. */
  readonly firstTime: boolean;
  readonly recipients: readonly string[];
  readonly limits: number;
  /** Of them, those that cannot be reckoned yet. */
  readonly notReckoned: number;
  /** What keeps the service from doing its work; each in words, with what to do. */
  readonly hindrances: readonly string[];
  /** What it does without: nobody is told, nothing can alarm. */
  readonly lacks: readonly string[];
  /** Worth knowing. */
  readonly remarks: readonly string[];
}

export async function checkSite(
  siteFile: SiteFile,
  nowMs: number,
  monotonicMs: () => number,
): Promise<SiteCheck> {
  const { site } = siteFile;
  const drop = await lookAtDrop(site);
  const hindrances = drop.problem === null ? [] : [drop.problem];
  const read = await readLedger(siteFile, nowMs, monotonicMs);
  if (read.refusal !== null) hindrances.push(read.refusal);
  const files = new FileLevels(site, (point) => read.points.get(point)?.choice ?? null);
  const adviser = new RecordingAdviser();
  const points: PointCheck[] = [];
  for (const point of site.machines.flatMap((machine) => machine.points))
    points.push(
      await checkPoint(site, point, { drop, files, adviser, ledger: read.points.get(point) ?? null }),
    );
  hindrances.push(...passwordProblems(site));
  const limits = points.reduce((sum, { point }) => sum + point.limits.length, 0);
  const notReckoned = points
    .flatMap(({ bands }) => bands.flatMap((band) => band.limits))
    .filter(({ now }) => 'unknown' in now).length;
  const recipients = recipientsOf(site);
  const lacks = [
    ...(limits === 0 ? ['no limit: nothing can ever alarm'] : []),
    ...(site.mail === null
      ? ['no mail: nobody will be told']
      : recipients.length === 0
        ? ['no recipients: nobody will be told']
        : []),
  ];
  const remarks = earlierTextRuns(site)
    ? ['the service runs with an earlier text of this file: send it SIGHUP, or restart it']
    : [];
  const { retired, firstTime } = read;
  return {
    site,
    drop,
    points,
    retired,
    firstTime,
    recipients,
    limits,
    notReckoned,
    hindrances,
    lacks,
    remarks,
  };
}

interface LedgerRead {
  readonly points: ReadonlyMap<PointCheck['point'], LedgerPoint>;
  readonly retired: Retired;
  readonly firstTime: boolean;
  readonly refusal: string | null;
}

async function readLedger(siteFile: SiteFile, nowMs: number, monotonicMs: () => number): Promise<LedgerRead> {
  const nothing = { points: new Map(), retired: nothingRetired, firstTime: false, refusal: null };
  const { site } = siteFile;
  const ledger = await openLedger({
    folder: site.folders.data,
    mode: 'guest',
    wallMs: () => nowMs,
    monotonicMs,
  });
  if (isLedgerRefusal(ledger)) {
    return ledger.refused === 'missing'
      ? { ...nothing, firstTime: true }
      : { ...nothing, refusal: ledger.reason };
  }
  try {
    return {
      ...nothing,
      points: await lookUpPoints(ledger, site),
      retired: await retiredBy(ledger, siteFile, nowMs),
    };
  } catch (error) {
    if (!(error instanceof LedgerError)) throw error;
    return { ...nothing, refusal: error.message };
  } finally {
    await ledger.close();
  }
}

async function lookUpPoints(ledger: Ledger, site: Site): Promise<Map<PointCheck['point'], LedgerPoint>> {
  const found = new Map<PointCheck['point'], LedgerPoint>();
  const ids = await ledger.read((reader) => readSiteIds(reader));
  if (ids === null) return found;
  for (const point of site.machines.flatMap((machine) => machine.points)) {
    const known = await ledger.read((reader) => lookUpPoint(reader, ids, site, point));
    if (known !== null) found.set(point, known);
  }
  return found;
}

/** A password that others can read is not sent, so mail would wait. */
function passwordProblems({ mail }: Site): string[] {
  const servers: (MailServer | null)[] = mail === null ? [] : [mail.server, mail.secondServer];
  return servers.flatMap((server) => {
    const file = server?.passwordFile ?? null;
    if (file === null) return [];
    const found = statSync(file, { throwIfNoEntry: false });
    if (found === undefined || !found.isFile())
      return [`there is no password file ${file}: write the password into it, then chmod 600 it`];
    const open = process.platform !== 'win32' && (found.mode & 0o077) !== 0;
    return open ? [`password file ${file} can be read by others, so it is not used: chmod 600 it`] : [];
  });
}

function earlierTextRuns(site: Site): boolean {
  const health = isOwned(site.folders.data) ? readHealth(site.folders.data) : null;
  return health !== null && health.configVersion !== site.configVersion;
}
