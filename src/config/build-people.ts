import { type Hours, minutesOfWeek, parseHours } from './hours.ts';
import { type Build, valueOr, valuesOf } from './layers.ts';
import { nearest } from './nearest.ts';
import { tellUncovered } from './recipient-cover.ts';
import type { mailKeys, serverKeys, WrittenSite } from './schema.ts';
import type { recipientKeys } from './schema-values.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { Machine, MailServer, MailSettings, Recipient, ReminderSettings, Site } from './site.ts';

type WrittenServer = Written<ReadMap<typeof serverKeys>>;
type WrittenRecipients = Written<readonly Written<ReadMap<typeof recipientKeys>>[]>;

const usualPort = { starttls: 587, tls: 465, none: 25 } as const;

/** Mail settings; null where there are none, or where what they need was refused. */
export function buildMail(
  build: Build,
  written: Written<ReadMap<typeof mailKeys>> | null,
  machines: readonly Machine[],
): MailSettings | null {
  if (written === null) return null;
  const { keys } = written.value;
  const server = keys.server === null ? null : buildServer(build, keys.server);
  const second = keys.second_server === null ? null : buildServer(build, keys.second_server);
  const to = buildRecipients(build, keys.to, machines);
  if (keys.to !== null) tellUncovered(build.reading, keys.to.at, to, machines);
  const holdDuring = buildNight(build, keys);
  if (keys.from === null || server === null) return null;
  return {
    from: keys.from.value,
    server,
    secondServer: second,
    gatherMs: valueOr(keys.gather_for, 300_000),
    gatherDangerMs: valueOr(keys.gather_danger_for, 10_000),
    catchUpAfterMs: valueOr(keys.catch_up_after, 86_400_000),
    ...(holdDuring === null ? {} : { holdDuring }),
    reminders: buildReminders(build, keys, machines),
    to,
  };
}

type MailMap = ReadMap<typeof mailKeys>['keys'];

/** The night in which alerts and troubles are held; null: they are not. */
function buildNight({ reading }: Build, keys: MailMap): Hours | null {
  const usual = parseHours('22:00..06:00');
  const night = keys.night?.value ?? (usual.ok ? usual.value : null);
  if (valueOr(keys.hold_overnight, false)) {
    if (keys.night !== null && night !== null && minutesOfWeek(night).every((within) => within === 1))
      reading.warn(keys.night.at, 'a night without a morning holds nothing back');
    return night;
  }
  if (keys.night !== null)
    reading.warn(keys.night.at, 'night without hold_overnight: true holds nothing back');
  return null;
}

function buildReminders({ reading }: Build, keys: MailMap, machines: readonly Machine[]): ReminderSettings {
  const { remind_after: after, then_to: thenTo, then_after: thenAfter } = keys;
  const limits = machines.flatMap(({ points }) => points.flatMap((point) => point.limits));
  const joins = thenTo !== null || limits.some((limit) => (limit.thenTo ?? []).length > 0);
  if (thenAfter !== null && !joins) reading.warn(thenAfter.at, 'then_after without then_to tells nobody');
  const reminded = limits.some((limit) => (limit.remindAfterMs ?? null) !== null);
  if (thenTo !== null && after !== null && after.value === null && !reminded)
    reading.warn(thenTo.at, 'then_to with remind_after: never tells nobody: they join a reminder');
  return {
    ...(after === null ? {} : { afterMs: after.value }),
    thenTo: valuesOf(thenTo),
    thenAfter: valueOr(thenAfter, { reminders: 2 }),
  };
}

function buildServer(
  { reading, absolute }: Build,
  { value: { keys, has }, at }: WrittenServer,
): MailServer | null {
  const { host, port, security, user, password_file: file } = keys;
  if (host === null) return null;
  const kind = valueOr(security, 'starttls');
  if (kind === 'none' && (has.has('user') || has.has('password_file'))) {
    const what = 'security: none would send the password in the clear';
    reading.problem(
      security?.at ?? at,
      what,
      'write: security: starttls, or leave user and password_file out',
    );
  }
  if (has.has('user') !== has.has('password_file')) {
    const missing = has.has('user') ? 'password_file: ./mail-password' : 'user: humledger';
    reading.problem(
      (user ?? file)?.at ?? at,
      'a login needs both user and password_file',
      `add: ${missing}, or leave both out`,
    );
  }
  return {
    host: host.value,
    port: valueOr(port, usualPort[kind]),
    security: kind,
    user: valueOr(user, null),
    passwordFile: file === null ? null : absolute(file.value),
  };
}

/** Recipients; machines and areas that nobody has are refused with the nearest known. */
export function buildRecipients(
  { reading }: Build,
  written: WrittenRecipients | null,
  machines: readonly Machine[],
): readonly Recipient[] {
  const ids = new Set(machines.map(({ id }) => id));
  const areas = new Set(machines.flatMap(({ area }) => area ?? []));
  const known = (
    list: Written<readonly Written<string>[]> | null,
    names: ReadonlySet<string>,
    what: string,
  ): readonly string[] | null => {
    for (const { value, at } of list?.value ?? []) {
      if (names.has(value)) continue;
      const meant = nearest(value, names);
      const all =
        names.size === 0
          ? `no machine has ${what === 'area' ? 'an area' : 'an id'}`
          : `known are ${[...names].slice(0, 20).join(', ')}`;
      reading.problem(at, `unknown ${what} '${value}'`, meant === null ? all : reading.write(at, meant));
    }
    return list === null ? null : list.value.map(({ value }) => value);
  };
  return (written?.value ?? []).flatMap(({ value: { keys } }) => {
    const concerned = {
      machines: known(keys.machines, ids, 'machine'),
      areas: known(keys.areas, areas, 'area'),
    };
    if (keys.address === null) return [];
    const severities = keys.severities === null ? null : keys.severities.value.map(({ value }) => value);
    const hours = keys.hours === null ? {} : { hours: keys.hours.value };
    return [{ address: keys.address.value, ...concerned, severities, ...hours }];
  });
}

/** At half past six to the recipients of mail, unless the file says otherwise. */
export function buildSummary(
  build: Build,
  site: WrittenSite,
  mail: MailSettings | null,
  machines: readonly Machine[],
): Site['summary'] {
  const keys = site.summary?.value.keys;
  const to = keys?.to ? buildRecipients(build, keys.to, machines) : (mail?.to ?? []);
  if (site.mail === null && keys?.to) {
    build.reading.warn(
      keys.to.at,
      'without mail: the summary is written to the data folder and sent to nobody',
    );
  }
  for (const { value, at } of keys?.to?.value ?? []) {
    if (value.keys.hours === null) continue;
    build.reading.warn(
      value.keys.hours.at ?? at,
      'hours say nothing here: the summary is sent at its own time',
    );
  }
  return { at: keys?.at?.value ?? { hour: 6, minute: 30 }, to };
}
