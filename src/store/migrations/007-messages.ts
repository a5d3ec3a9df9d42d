import type { Migration } from './index.ts';

/** Floods, and reminders that an acknowledgement has overtaken. */
export const messages: Migration = {
  number: 7,
  name: 'messages',
  statements: [
    `
    create table floods (
      id integer primary key, from_ms integer not null, begun_ms integer not null, ended_ms integer) strict;
    create unique index flood_stands on floods (ifnull(ended_ms, 0)) where ended_ms is null;
    create index flood_by_end on floods (ended_ms);
    create index message_by_group on messages (group_key, id);
    create index event_by_wall on to_tell (wall_ms);
    create index event_by_message on to_tell (message_id) where message_id is not null;`,
    `
    alter table to_tell add column withdrawn_ms integer;
    drop index event_untold;
    create index event_untold on to_tell (id) where message_id is null and withdrawn_ms is null;`,
  ],
};
