import { createHash } from 'node:crypto';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { filesBelow } from '../service/site-on-disk.ts';

/**
 * Everything that a story must leave behind whatever happened on the way. Left out: wall-clock columns (arrived, raised,
 * told, tried), row ids, tries of deliveries, the service's own starts and stops with their mails, and the mail's bytes
 * (they say when they were written).
 */
const queries: Readonly<Record<string, string>> = {
  recordings: `select file_name, identity, content_sha256, sidecar_sha256, stated_ms, start_origin, used_ms, size_bytes,
    outcome, reason, evaluated, quality, filing_from, filing_to, filing_state from recordings order by file_name, identity, outcome`,
  attempts: 'select file_name, unfinished from attempts order by file_name',
  sources: `select name, clock_offset_ms, newest_stated_ms, newest_used_ms, repeats_in_a_row from sources order by name`,
  arrivals: `select point_id, newest_used_ms, newest_evaluated_used_ms, recordings from point_arrivals order by point_id`,
  measurements: `select file_name, point_id, settings_fingerprint, is_current, m.used_ms, rms, peak, speed_rpm, machine_state,
    m.evaluated, m.quality, averages, pooled_recordings from measurements m join recordings r on r.id = recording_id order by file_name, point_id`,
  levels:
    'select point_id, used_ms, band_id, series_id, level, in_trend from levels order by point_id, used_ms, band_id',
  peaks: `select point_id, used_ms, rank, frequency_hz, level from peaks join measurements m on m.id = measurement_id
    order by point_id, used_ms, rank`,
  spectra:
    'select point_id, used_ms, at_alarm, hex(density) as density from spectra order by point_id, used_ms',
  pools: `select point_id, recordings, file_name, newest_used_ms, facts, hex(density) as density from open_pools
    join recordings on recordings.id = recording_id order by point_id`,
  machines: 'select machine_id, state, used_ms, version from machine_states order by machine_id',
  states: 'select key, number, condition, state, version from alarm_states order by key',
  lives:
    'select number, key, severity, raised_used_ms, ended_wall_ms is null as stands from alarms order by number',
  journal: `select key, number, event, before, after, j.used_ms, file_name, j.reason from journal j
    left join recordings r on r.id = recording_id where event not in ('started', 'stopped') order by sequence`,
  told: `select key, number, severity, event, level, identity, message_id is not null as told, from_backlog from to_tell order by id`,
  messages: `select kind, identity, subject, priority from messages where kind <> 'service' order by identity`,
  deliveries: `select mail_id, recipient, state from deliveries join messages on messages.id = message_id
    where kind <> 'service' order by mail_id`,
  summaries: 'select local_date, message_id is not null as mailed from summaries order by local_date',
};

export interface StoryState {
  readonly ledger: Readonly<Record<string, readonly unknown[]>>;
  /** Paths with the beginning of each file's hash. */
  readonly files: Readonly<Record<string, readonly string[]>>;
  /** Message-IDs that the server accepted, each once. */
  readonly mails: readonly string[];
}

export function stateOf(drop: string, data: string, received: readonly string[]): StoryState {
  const ledger = new Database(join(data, 'ledger.sqlite'), { readonly: true });
  try {
    const service = ledger
      .prepare(
        "select mail_id from deliveries join messages on messages.id = message_id where kind = 'service'",
      )
      .pluck()
      .all() as string[];
    return {
      ledger: Object.fromEntries(
        Object.entries(queries).map(([table, query]) => [table, ledger.prepare(query).all()]),
      ),
      files: {
        drop: hashed(drop),
        archive: hashed(join(data, 'archive')),
        quarantine: hashed(join(data, 'quarantine')),
        unassigned: hashed(join(data, 'unassigned')),
      },
      mails: [...new Set(received)].filter((id) => !service.includes(id)).sort(),
    };
  } finally {
    ledger.close();
  }
}

function hashed(folder: string): string[] {
  return filesBelow(folder).map((path) => {
    const hash = createHash('sha256').update(readFileSync(join(folder, path)));
    return `${path} ${hash.digest('hex').slice(0, 16)}`;
  });
}
