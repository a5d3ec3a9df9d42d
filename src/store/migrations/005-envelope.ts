import type { Migration } from './index.ts';

/** Envelopes: how each was made, its peaks, its spectrum, and the choice of the band that is demodulated. */
export const envelope: Migration = {
  number: 5,
  name: 'envelope',
  statements: [
    `
    create table envelopes (
      measurement_id integer primary key, from_hz real not null, to_hz real not null,
      chosen text not null check (chosen in ('fixed', 'kurtosis')), line_spacing_hz real not null,
      segment_samples integer not null, averages integer not null, effective_averages real not null,
      used_percent real not null) strict;
    create table envelope_peaks (
      measurement_id integer not null, rank integer not null, frequency_hz real not null, level real not null,
      above_floor_db real not null, kind text not null, order_of_speed real, names text,
      primary key (measurement_id, rank)) strict, without rowid;
    create table envelope_spectra (
      measurement_id integer primary key, line_spacing_hz real not null, density blob not null) strict;
    create table envelope_choices (
      point_id integer primary key references points, choice text not null) strict;`,
  ],
};
