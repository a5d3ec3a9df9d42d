import type { Migration } from './index.ts';

/** Shelves and places out of service, each with its end and who ordered it. */
export const suppressions: Migration = {
  number: 6,
  name: 'suppressions',
  statements: [
    `
    alter table alarm_states add column suppressed integer not null default 0 check (suppressed in (0, 1));
    alter table alarm_states add column shelved_ms integer;
    alter table alarm_states add column shelved_until_ms integer;
    alter table alarm_states add column shelved_by text;
    alter table alarm_states add column shelved_comment text;
    create index alarm_state_suppressed on alarm_states (suppressed) where suppressed = 1;
    create index alarm_state_shelved on alarm_states (shelved_until_ms) where shelved_until_ms is not null;`,
    `
    create table out_of_service (
      id integer primary key, machine_id integer not null references machines, point_id integer references points,
      from_ms integer not null, until_ms integer not null, by_name text not null, comment text not null) strict;
    create unique index out_of_service_once on out_of_service (machine_id, ifnull(point_id, 0));`,
  ],
};
