import type { Migration } from './index.ts';

/**
 * The first tables. STRICT: a fraction never gets into an integer column, a text never into a number. Foreign keys
 * where a row is written seldom; the rows that come by the dozen with each recording (levels, peaks, spectra)
 * do without, their parents are never deleted.
 */
export const first: Migration = {
  number: 1,
  name: 'first',
  statements: [site(), intake(), trends(), alarms(), outbox()],
};

function site(): string {
  return `
    create table meta (key text primary key, value text not null) strict, without rowid;
    create table config_versions (
      id integer primary key, sha256 text not null unique, loaded_ms integer not null, text text not null) strict;
    create table machines (id integer primary key, id_in_site text not null, retired_ms integer) strict;
    create table points (
      id integer primary key, machine_id integer not null references machines, id_in_site text not null,
      retired_ms integer) strict;
    create table bands (
      id integer primary key, point_id integer not null references points, id_in_site text not null,
      retired_ms integer) strict;
    create table limits (
      id integer primary key, point_id integer not null references points, band_id integer not null references bands,
      id_in_site text not null, retired_ms integer) strict;
    create unique index machine_in_use on machines (id_in_site) where retired_ms is null;
    create unique index point_in_use on points (machine_id, id_in_site) where retired_ms is null;
    create unique index band_in_use on bands (point_id, id_in_site) where retired_ms is null;
    create unique index limit_in_use on limits (band_id, id_in_site) where retired_ms is null;`;
}

function intake(): string {
  return `
    create table sources (
      id integer primary key, name text not null unique, clock_offset_ms integer not null,
      newest_stated_ms integer, newest_used_ms integer, last_arrived_ms integer, last_evaluated_arrived_ms integer,
      repeats_in_a_row integer not null) strict;
    create table attempts (
      file_key text primary key, file_name text not null, begun_ms integer not null,
      unfinished integer not null) strict, without rowid;
    create table recordings (
      id integer primary key, identity text not null, source_id integer references sources,
      content_sha256 text not null, sidecar_sha256 text, stated_ms integer, start_origin text,
      arrived_ms integer not null, used_ms integer, file_name text not null, size_bytes integer not null,
      duration_s real, sample_rate_hz real, channel_count integer,
      config_version_id integer not null references config_versions,
      outcome text not null check (outcome in ('taken', 'repeat', 'quarantined', 'unassigned')),
      reason text, evaluated integer not null check (evaluated in (0, 1)), quality text not null,
      filing_from text not null, filing_to text,
      filing_state text not null check (filing_state in ('pending', 'filed'))) strict;
    create unique index recording_taken_once on recordings (identity) where outcome = 'taken';
    create index recording_by_source on recordings (source_id, used_ms) where outcome = 'taken';
    create index recording_by_content on recordings (content_sha256);
    create index recording_to_file on recordings (id) where filing_state = 'pending';
    create index recording_by_arrival on recordings (arrived_ms, outcome);
    create table seen_files (
      path text primary key, size_bytes integer not null, mtime_ms integer not null, ctime_ms integer not null,
      recording_id integer references recordings) strict, without rowid;
    create table told_once (key text primary key, wall_ms integer not null) strict, without rowid;
    create table point_arrivals (
      point_id integer primary key references points, last_arrived_ms integer not null, newest_used_ms integer,
      newest_evaluated_used_ms integer, recordings integer not null) strict;
    create table machine_states (
      machine_id integer primary key references machines, state text not null, used_ms integer,
      version integer not null) strict;`;
}

function trends(): string {
  return `
    create table measurements (
      id integer primary key, recording_id integer not null references recordings,
      point_id integer not null references points, settings_fingerprint text not null,
      is_current integer not null check (is_current in (0, 1)), used_ms integer not null, channel text not null,
      quantity text not null, unit text not null, sample_rate_hz real not null, duration_s real not null, speed_rpm real, speed_origin text,
      speed_uncertainty_rpm real, load_percent real, running_said integer check (running_said in (0, 1)), machine_state text not null,
      evaluated integer not null check (evaluated in (0, 1)), mean real, rms real, peak real, crest_factor real,
      kurtosis real, skewness real, window text, overlap_percent real, segment_samples integer,
      line_spacing_hz real, averages integer, effective_averages real, used_percent real, segment_spread real, confidence_percent real,
      quality text not null, unique (recording_id, point_id, settings_fingerprint)) strict;
    create index measurement_by_point on measurements (point_id, used_ms);
    create index measurement_unflagged on measurements (point_id, used_ms) where quality = '[]';
    create table series (
      id integer primary key, point_id integer not null references points, band_id integer not null references bands,
      fingerprint text not null, quantity text not null, from_hz real not null, to_hz real not null,
      began_ms integer not null, unique (point_id, band_id, fingerprint)) strict;
    create table levels (
      point_id integer not null, used_ms integer not null, band_id integer not null, series_id integer not null,
      measurement_id integer not null, level real not null, interval_low real not null, interval_high real not null,
      exceeded_by_80_percent real, at_least integer not null check (at_least in (0, 1)),
      in_trend integer not null check (in_trend in (0, 1)),
      primary key (point_id, used_ms, band_id, series_id)) strict, without rowid;
    create table peaks (
      measurement_id integer not null, rank integer not null, frequency_hz real not null, level real not null,
      above_floor_db real not null, kind text not null, order_of_speed real,
      primary key (measurement_id, rank)) strict, without rowid;
    create table spectra (
      measurement_id integer primary key, point_id integer not null, used_ms integer not null,
      at_alarm integer not null check (at_alarm in (0, 1)), line_spacing_hz real not null, density blob not null) strict;
    create index spectrum_by_point on spectra (point_id, used_ms, at_alarm);`;
}

/** Triggers keep the journal append-only, whoever writes. One open conversation a machine; 0 stands for the site. */
function alarms(): string {
  return `
    create table alarms (
      number integer primary key, key text not null, severity text not null, raised_used_ms integer,
      raised_wall_ms integer not null, ended_wall_ms integer, acknowledged_wall_ms integer,
      acknowledged_by text) strict;
    create index alarm_unended on alarms (number) where ended_wall_ms is null;
    create table alarm_states (
      key text primary key, subject text not null, machine_id integer references machines,
      point_id integer references points, limit_id integer references limits, number integer references alarms,
      condition text not null, state text not null, version integer not null) strict, without rowid;
    create index alarm_state_by_machine on alarm_states (machine_id);
    create table journal (
      sequence integer primary key, key text, number integer references alarms, event text not null, before text,
      after text, used_ms integer, wall_ms integer not null, recording_id integer references recordings,
      config_version_id integer references config_versions, actor text not null,
      via text not null check (via in ('service', 'command', 'page', 'link')), comment text,
      reason text not null) strict;
    create index journal_by_key on journal (key, sequence) where key is not null;
    create index journal_by_number on journal (number, sequence) where number is not null;
    create trigger journal_never_changes before update on journal
      begin select raise(abort, 'the journal is only ever added to'); end;
    create trigger journal_never_shrinks before delete on journal
      begin select raise(abort, 'the journal is only ever added to'); end;`;
}

function outbox(): string {
  return `
    create table threads (
      id integer primary key, machine_id integer references machines, opened_ms integer not null,
      closed_ms integer, subject text not null, severity text not null) strict;
    create unique index thread_open on threads (ifnull(machine_id, 0)) where closed_ms is null;
    create table messages (
      id integer primary key, kind text not null, identity text not null unique, priority integer not null,
      group_key text not null, thread_id integer references threads, subject text not null,
      created_ms integer not null, not_before_ms integer not null, superseded_by integer references messages) strict;
    create index message_by_thread on messages (thread_id) where thread_id is not null;
    create table deliveries (
      mail_id text primary key, message_id integer not null references messages, recipient text not null,
      due_ms integer not null, tries integer not null, last_try_ms integer, last_answer text,
      state text not null check (state in ('waiting', 'accepted', 'failed', 'superseded')),
      bytes blob not null, unique (message_id, recipient)) strict;
    create index delivery_by_state on deliveries (state, last_try_ms);
    create index delivery_by_recipient on deliveries (recipient, last_try_ms, mail_id) where last_try_ms is not null;
    create index delivery_by_try on deliveries (last_try_ms, mail_id) where last_try_ms is not null;
    create index delivery_waiting on deliveries (due_ms) where state = 'waiting';
    create table to_tell (
      id integer primary key, journal_sequence integer not null references journal, key text,
      number integer references alarms, machine_id integer references machines, severity text not null,
      event text not null, level real, identity text not null unique, wall_ms integer not null,
      message_id integer references messages, from_backlog integer not null check (from_backlog in (0, 1))) strict;
    create index event_untold on to_tell (id) where message_id is null;
    create index event_by_number on to_tell (number);
    create table summaries (
      local_date text primary key, created_ms integer not null, message_id integer references messages,
      html text not null, facts text not null) strict;`;
}
