import { statSync } from 'node:fs';
import { printableName } from '../../acquisition/file-name.ts';
import { durationText } from '../../advisory/time-words.ts';
import { printNumber } from '../../config/print-value.ts';
import { pointPath, type Site } from '../../config/site.ts';
import { readHealth } from '../../service/health.ts';
import { type Status, statusOf } from '../../service/status.ts';
import { isOwned } from '../../store/owner-lock.ts';
import { placePath } from '../../store/suppressions.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { wallMs, withLedger, withSite } from '../open.ts';
import { listing, writeJson } from '../output.ts';
import { timeText } from '../when.ts';

/** `status`: whether the service runs and what waits; exit status 1 where it does not run or is stuck. */
export const addStatus: AddCommand = (program, io, done) => {
  program
    .command('status')
    .description(
      'whether the service runs, what came last, what waits; exit status 1 when it does not run or is stuck',
    )
    .option('--site <file>', 'site file', './site.yaml')
    .option('--json', 'as JSON')
    .addHelpText(
      'after',
      '\nExample:\n  humledger status --site /etc/humledger/site.yaml || echo look after it',
    )
    .action(async (options: { site: string; json?: boolean }) => {
      done(await status(options, io));
    });
};

function status(options: { site: string; json?: boolean }, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, options.site, ({ site }) =>
    withLedger(io, site, 'reader', async (ledger) => {
      const seen = {
        running: isOwned(site.folders.data),
        health: readHealth(site.folders.data),
        nowMs: wallMs(io),
      };
      const answer = await ledger.read((reader) => statusOf(reader, site, seen));
      const sizes = {
        ledgerBytes: statSync(ledger.path, { throwIfNoEntry: false })?.size ?? 0,
        walBytes: ledger.walBytes(),
      };
      if (options.json === true) writeJson(io.out, statusJson(answer, site, sizes));
      else io.out.write(statusText(answer, site, sizes, seen.nowMs));
      return answer.running && !answer.stuck ? 0 : 1;
    }),
  );
}

interface Sizes {
  readonly ledgerBytes: number;
  readonly walBytes: number;
}

function statusJson(status: Status, site: Site, sizes: Sizes): Record<string, unknown> {
  const { health, newest, lastMail, lastSummary } = status;
  const iso = (ms: number | null | undefined) => (ms == null ? null : new Date(ms).toISOString());
  return {
    site: site.name,
    running: status.running,
    stuck: status.stuck,
    pid: status.running ? (health?.pid ?? null) : null,
    running_since: status.running ? iso(status.startedMs) : null,
    last_round: iso(status.roundMs),
    site_file_in_force: status.siteFileInForce,
    newest_recording: newest && {
      file: newest.fileName,
      start: iso(newest.usedMs),
      arrived: iso(newest.arrivedMs),
    },
    overdue: status.overdue.map(({ machineId, pointId, number, lastArrivedMs }) => ({
      machine: machineId,
      point: pointId,
      number,
      last_arrived: iso(lastArrivedMs),
    })),
    standing: status.standing,
    held_back: {
      shelved: status.held.shelved,
      suppressed: status.held.byDesign,
      out_of_service: status.held.outOfService,
    },
    out_of_service: status.outOfService.map(({ machine, point, untilMs, by, comment }) => ({
      machine,
      point,
      until: iso(untilMs),
      by,
      comment,
    })),
    limits_not_reckoned: (status.unwatched ?? []).map(({ point, limit, why }) => ({
      machine: point.machineId,
      point: point.id,
      band: limit.bandId,
      limit: limit.id,
      why,
    })),
    drop_folder: health?.dropFolder ?? null,
    files_waiting: health?.filesWaiting ?? null,
    files_unfiled: health?.filesUnfiled ?? null,
    unassigned: health?.unassigned ?? [],
    unassigned_count: health?.unassignedCount ?? null,
    mails_waiting: status.mailsWaiting,
    events_gathered: status.eventsGathered,
    mail_server: lastMail && {
      answer: lastMail.answer,
      time: iso(lastMail.triedMs),
      recipient: lastMail.recipient,
      delivery: lastMail.state,
    },
    last_summary: lastSummary && { date: lastSummary.localDate, written: iso(lastSummary.createdMs) },
    ledger_bytes: sizes.ledgerBytes,
    wal_bytes: sizes.walBytes,
    ledger_damage: health?.ledgerDamage ?? null,
  };
}

function statusText(status: Status, site: Site, sizes: Sizes, nowMs: number): string {
  const ago = (ms: number) => `${timeText(ms, site.timeZone)}, ${durationText(nowMs - ms)} ago`;
  const lines: [string, string][] = [
    ['service', serviceText(status, ago)],
    ['newest recording', newestText(status, ago)],
    ...overdueLines(status, ago),
    ['standing', standingText(status)],
    ...outOfServiceLines(status, site),
    ...unwatchedLines(status),
    ...fileLines(status),
    ...mailLines(status, site, ago),
    ['last summary', status.lastSummary === null ? 'none yet' : ago(status.lastSummary.createdMs)],
    ['ledger', `${megabytes(sizes.ledgerBytes)}, write-ahead log ${megabytes(sizes.walBytes)}`],
  ];
  if (status.health?.ledgerDamage != null) lines.push(['ledger damaged', status.health.ledgerDamage]);
  if (status.siteFileInForce === false) {
    lines.push([
      'site file',
      'differs from the one in force; send the service SIGHUP (or restart it) to take it over, after humledger check',
    ]);
  }
  return `${listing(lines)}times of ${site.timeZone}\n`;
}

type Ago = (ms: number) => string;

function serviceText({ running, stuck, startedMs, roundMs, health }: Status, ago: Ago): string {
  if (!running) return roundMs === null ? 'does not run' : `does not run; last round ${ago(roundMs)}`;
  const since = startedMs === null ? '' : ` since ${ago(startedMs)}`;
  const pid = health === null || roundMs === null ? '' : ` (process ${health.pid})`;
  if (stuck) {
    const last =
      roundMs === null ? 'it has not finished a round yet' : `its last round ended ${ago(roundMs)}`;
    return `stuck${pid}: runs${since}, but ${last}; restart it, and see its log`;
  }
  return `running${since}${pid}`;
}

function newestText({ newest }: Status, ago: Ago): string {
  if (newest === null) return 'none yet';
  const name = printableName(newest.fileName);
  return newest.usedMs === null ? name : `${name}, of ${ago(newest.usedMs)}`;
}

function overdueLines({ overdue }: Status, ago: Ago): [string, string][] {
  if (overdue.length === 0) return [['overdue', 'no point']];
  return overdue.map(({ machineId, pointId, number, lastArrivedMs }, n) => [
    n === 0 ? 'overdue' : '',
    `${machineId}/${pointId}, number ${number}: ${lastArrivedMs === null ? 'never sent anything' : `last arrival ${ago(lastArrivedMs)}`}`,
  ]);
}

function standingText({ standing, held }: Status): string {
  const { danger, alert, trouble } = standing;
  const heldBack = [
    [held.shelved, 'shelved'],
    [held.byDesign, 'by design'],
    [held.outOfService, 'out of service'],
  ] as const;
  const beside = heldBack.filter(([count]) => count > 0).map(([count, words]) => `${count} ${words}`);
  const counts =
    danger + alert + trouble === 0 ? [] : [`danger ${danger}, alert ${alert}, trouble ${trouble}`];
  const said = [...counts, ...(beside.length === 0 ? [] : [`held back ${beside.join(', ')}`])];
  return said.length === 0 ? 'nothing' : `${said.join('; ')}; see humledger alarms`;
}

/** Limits that judge nothing now, so that nobody believes a band is watched that is not. */
function unwatchedLines({ unwatched }: Status): [string, string][] {
  const all = unwatched ?? [];
  const [first] = all;
  if (first === undefined) return [];
  const more = all.length === 1 ? '' : `; and ${all.length - 1} more, see humledger check`;
  const { point, limit, why } = first;
  return [['not reckoned', `limit ${limit.id} of ${pointPath(point)}: ${why}${more}`]];
}

function outOfServiceLines({ outOfService }: Status, site: Site): [string, string][] {
  return outOfService.map((place, n) => [
    n === 0 ? 'out of service' : '',
    `${placePath(place)} until ${timeText(place.untilMs, site.timeZone)}, by ${place.by}: ${place.comment}`,
  ]);
}

function fileLines({ health }: Status): [string, string][] {
  if (health === null) return [['files', 'not known: the service has finished no round yet']];
  const unfiled = health.filesUnfiled === 0 ? '' : `, ${health.filesUnfiled} taken but still to be moved`;
  const lines: [string, string][] = [
    [
      'drop folder',
      health.dropFolder === 'read'
        ? `${health.filesWaiting} files waiting${unfiled}`
        : `cannot be read: ${health.dropFolder}`,
    ],
  ];
  if (health.unassignedCount > 0) {
    const names = health.unassigned.slice(0, 3).map(printableName).join(', ');
    const more = health.unassignedCount > 3 ? ` and ${health.unassignedCount - 3} more` : '';
    lines.push(['unassigned', `${names}${more}; see humledger files`]);
  }
  return lines;
}

function mailLines(
  { lastMail, mailsWaiting, eventsGathered }: Status,
  site: Site,
  ago: Ago,
): [string, string][] {
  if (site.mail === null)
    return [['mails', 'none: without mail in the site file nobody is told of an alarm']];
  const answer =
    lastMail === null
      ? 'not asked yet'
      : `${lastMail.answer} (${lastMail.recipient}, ${ago(lastMail.triedMs)})`;
  return [
    ['mails', `${mailsWaiting} waiting, ${eventsGathered} events being gathered`],
    ['mail server', answer],
  ];
}

function megabytes(bytes: number): string {
  return bytes < 1e5 ? `${printNumber(bytes / 1000)} kB` : `${printNumber(bytes / 1e6)} MB`;
}
