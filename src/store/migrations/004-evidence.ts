import type { Migration } from './index.ts';

/** Names of lines, and what a measurement's lines say of the machine's parts. */
export const evidence: Migration = {
  number: 4,
  name: 'evidence',
  statements: [
    `
    alter table peaks add column names text;
    create table evidence (
      measurement_id integer not null, rank integer not null, part text not null, fault text not null,
      grade text not null check (grade in ('weak', 'clear', 'strong', 'not separable')), evidence text not null,
      primary key (measurement_id, rank)) strict, without rowid;`,
  ],
};
