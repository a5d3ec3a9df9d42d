import { parseHours } from './hours.ts';
import { parseHowOften } from './how-often.ts';
import { type Parsed, parsePhysical, refused, shorten, understood } from './quantity.ts';
import { machines, machineTypes } from './schema-machines.ts';
import { analysis, siteRecordings } from './schema-recordings.ts';
import { addresses, duration, durationOrNever, recipients, senderAddress } from './schema-values.ts';
import { choice, type JsonSchema, plainNumber, scalar, trueOrFalse, words } from './shape.ts';
import { key, keyHomes, map, type ReadMap, type ReadOf } from './shape-map.ts';
import { parseThenAfter } from './then-after.ts';
import { parseTimeOfDay, parseTimeZone } from './time-zone.ts';

const day = 86_400_000;

/** A path as written; relative ones are seen from the site file's folder. */
const path = words(500, './drop');

function parseFileSize(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['bytes'], 'GB');
  if (!parsed.ok) return parsed;
  const { value } = parsed.value;
  return value >= 1e6 && value <= 1e12
    ? understood(Math.round(value))
    : refused(`'${shorten(text)}' is not from 1 MB to 1000 GB`);
}

export const folderKeys = {
  drop: key(path, 'Where the logger drops its recordings.', { required: true }),
  data: key({ ...path, example: './data' }, 'Ledger, archive, quarantine, summaries. Not inside drop.', {
    required: true,
  }),
  after_reading: key(choice(['archive', 'keep', 'delete']), 'What becomes of a recording that was read.', {
    fallback: 'archive',
  }),
  polling: key(trueOrFalse, 'Look for files by polling, for network shares.', { fallback: 'false' }),
  sweep_every: key(
    duration(1000, 3_600_000, '2 min'),
    'The whole drop folder is looked through this often, whatever events came.',
    { fallback: '2 min' },
  ),
  largest_file: key(scalar(parseFileSize, { example: '4 GB' }), 'A larger file is not read.', {
    fallback: '4 GB',
  }),
};

const host = scalar<string>(
  (text) => {
    const written = text.trim();
    if (/^[A-Za-z0-9_:.-]{1,253}$/.test(written)) return understood(written);
    return refused(`'${shorten(text)}' is no host name or address`);
  },
  { example: '127.0.0.1', free: true },
);

export const serverKeys = {
  host: key(host, 'Name or address of the mail server.', { required: true }),
  port: key(plainNumber(1, 65_535, true, '587'), 'Its port.', {
    fallback: '587 for starttls, 465 for tls, 25 for none',
  }),
  security: key(choice(['starttls', 'tls', 'none']), 'none only without a password.', {
    fallback: 'starttls',
  }),
  user: key(words(200, 'humledger'), 'Login name, where the server wants one.'),
  password_file: key(
    { ...path, example: './mail-password' },
    'File that holds the password, readable by the service alone.',
  ),
};

export const mailKeys = {
  from: key(senderAddress, "The sender's address.", { required: true }),
  server: key(map(serverKeys), 'Where mails are handed over.', { required: true }),
  second_server: key(map(serverKeys), 'Used for what the first refuses for good.'),
  gather_for: key(
    duration(0, 3_600_000, '5 min'),
    'Events of one machine travel together: the first waits this long.',
    { fallback: '5 min' },
  ),
  gather_danger_for: key(duration(0, 600_000, '10 s'), 'A danger waits only this long.', {
    fallback: '10 s',
  }),
  catch_up_after: key(
    duration(60_000, 30 * day, '24 h'),
    'Alarms older than this that came and went are told in one mail.',
    { fallback: '24 h' },
  ),
  hold_overnight: key(
    trueOrFalse,
    'Alerts and troubles of the night are mailed in the morning. Danger never waits.',
    {
      fallback: 'false',
    },
  ),
  night: key(
    scalar(parseHours, { example: '22:00..06:00', free: true, most: 40 }),
    "The night of hold_overnight, in the site's time zone.",
    { fallback: '22:00..06:00' },
  ),
  remind_after: key(
    durationOrNever(5 * 60_000, 30 * day, '4 h'),
    'Reminder of what was told and nobody has acknowledged, repeated after growing pauses; or never. Limits may have their own.',
    { fallback: '1 h for danger, never for alert and trouble' },
  ),
  then_to: key(addresses, 'Who is told as well when reminders have not helped, in this order.'),
  then_after: key(
    scalar(parseThenAfter, { example: '2 reminders' }),
    'Reminders, or time since the first mail, after which the first of then_to is told; then one after the other.',
    { fallback: '2 reminders' },
  ),
  to: key(recipients, 'Who gets alarm mails.', { required: true }),
};

export const summaryKeys = {
  at: key(
    scalar(parseTimeOfDay, { example: "'06:30'", pattern: '^[0-9]{1,2}:[0-9]{2}$' }),
    "When the summary is sent, in the site's time zone.",
    { fallback: "'06:30'" },
  ),
  to: key(recipients, 'Who gets the summary.', { fallback: 'the recipients of mail' }),
};

function parseListen(text: string): Parsed<{ readonly host: string; readonly port: number }> {
  const match = /^(\[[0-9A-Fa-f:.]+\]|[A-Za-z0-9_.-]+):(\d{1,5})$/.exec(text.trim());
  if (match !== null && Number(match[2]) >= 1 && Number(match[2]) <= 65_535) {
    return understood({ host: match[1].replace(/^\[|\]$/g, ''), port: Number(match[2]) });
  }
  const port = /^\d{1,5}$/.test(text.trim()) ? `127.0.0.1:${text.trim()}` : null;
  return refused(`'${shorten(text)}' is no address and port, such as 127.0.0.1:8470`, port);
}

export const pageKeys = {
  listen: key(
    scalar(parseListen, { example: '127.0.0.1:8470', free: true }),
    'Address and port of the local page.',
    { required: true },
  ),
};

/** The whole file, key by key. */
export const siteKeys = {
  site: key(words(120, 'Larkfen Waterworks'), 'Name of the site, for people.', { required: true }),
  time_zone: key(
    scalar(parseTimeZone, { example: 'Europe/Dublin' }),
    'IANA name of the time zone in which people read times.',
    { required: true },
  ),
  folders: key(map(folderKeys), 'Where files come from and go to. Paths are seen from the site file.', {
    required: true,
  }),
  recordings: key(siteRecordings, 'How recordings arrive; machine types, machines and points may override.'),
  analysis: key(analysis, 'How spectra are averaged; machine types, machines and points may override.'),
  machine_types: key(machineTypes, 'Bands and limits shared by machines of one kind.'),
  machines: key(machines, 'The machines and their measuring points.', { required: true }),
  shelve_at_most: key(
    duration(60_000, 90 * day, '7 d'),
    'An alarm can be shelved for at most this long; then it speaks again by itself.',
    { fallback: '7 d' },
  ),
  alarm_budget: key(
    scalar(parseHowOften, {
      example: '5 a week',
      pattern: '^[0-9.]+\\s*(an?|per|/)\\s*(day|week|month|year)$',
    }),
    'New alarms that one person can see to; rehearse holds a site file against it. So often a day, week, month or year.',
    { fallback: '5 a week' },
  ),
  mail: key(map(mailKeys), 'Alarm mails. Without it nobody is told.'),
  summary: key(map(summaryKeys), "The morning's report.", {
    fallback: "at '06:30' to the recipients of mail",
  }),
  page: key(map(pageKeys), 'The local web page. Without it there is none.'),
};

export type WrittenSite = ReadOf<typeof siteKeys>;
export const siteShape = map(siteKeys);
export type SiteMap = ReadMap<typeof siteKeys>;
export const homesOfKeys = keyHomes(siteShape, 'the top');

/** The JSON Schema of the site file (draft 2020-12), for editors. What needs arithmetic, only `check` finds. */
export function siteJsonSchema(): JsonSchema {
  return {
    $schema: 'https://json-schema.org/draft/2020-12/schema',
    title: 'Humledger site file',
    ...siteShape.jsonSchema,
  };
}
