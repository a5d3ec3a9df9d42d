import type { Migration } from './index.ts';

/** Recordings that are averaged together, and spectra that are no mean of their segments. */
export const pooling: Migration = {
  number: 3,
  name: 'pooling',
  statements: [
    `
    create table open_pools (
      point_id integer primary key references points, recording_id integer not null references recordings,
      recordings integer not null, newest_used_ms integer not null, facts text not null,
      density blob not null, envelope_density blob) strict;
    alter table measurements add column pooled_recordings integer;
    alter table measurements add column waits integer check (waits = 1);
    alter table spectra add column averaging text;`,
  ],
};
