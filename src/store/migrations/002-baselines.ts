import type { Migration } from './index.ts';

/** Operating conditions, running hours, daily levels, baselines, notes. */
export const baselines: Migration = {
  number: 2,
  name: 'baselines',
  statements: [
    `
    create table conditions (
      id integer primary key, machine_id integer not null references machines, id_in_site text not null,
      unique (machine_id, id_in_site)) strict;
    alter table measurements add column condition text;
    alter table measurements add column running_hours real;
    alter table levels add column condition_id integer not null default 0;`,
    `
    create table daily_levels (
      point_id integer not null, band_id integer not null, series_id integer not null, condition_id integer not null,
      day integer not null, used_ms integer not null, running_hours real, count integer not null,
      least real not null, median real not null, greatest real not null,
      primary key (point_id, band_id, series_id, condition_id, day)) strict, without rowid;
    create table day_marks (
      point_id integer primary key references points, used_ms integer not null) strict;
    create table baselines (
      series_id integer not null references series, condition_id integer not null,
      state text not null check (state in ('learning', 'provisional', 'learned', 'refined', 'frozen', 'refused')),
      learn_from_ms integer not null, from_ms integer, to_ms integer, running_days integer not null,
      recordings integer not null, median_log real, spread_log real, refused text, confirmed_by text,
      confirm_comment text, primary key (series_id, condition_id)) strict, without rowid;
    create table notes (
      id integer primary key, machine_id integer not null references machines, point_id integer references points,
      kind text not null check (kind in ('repair', 'sensor-changed', 'lubricated', 'balanced', 'remark')),
      at_ms integer not null, wall_ms integer not null, found text, by_name text not null, comment text) strict;
    create index note_by_machine on notes (machine_id, at_ms);`,
  ],
};
