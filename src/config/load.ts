import { createHash } from 'node:crypto';
import { readFileSync, statSync } from 'node:fs';
import { dirname, relative, resolve } from 'node:path';
import { buildMachines } from './build-machines.ts';
import { buildMail, buildSummary } from './build-people.ts';
import { tellDoubleClaims } from './claims.ts';
import { type Build, valueOr } from './layers.ts';
import { tellOtherLayouts } from './one-layout.ts';
import { Reading } from './reading.ts';
import { homesOfKeys, siteShape, type WrittenSite } from './schema.ts';
import type { IntakeTimings, Site } from './site.ts';
import { formatProblem, type SiteProblem, SiteText } from './site-text.ts';
import { mostCharacters, readYaml } from './site-yaml.ts';
import { readZoneTable, type ZoneStandard, type ZoneTable } from './zone-tables.ts';

/** A site, or every problem of the file at once. */
export type SiteAnswer =
  | { readonly ok: true; readonly site: Site }
  | { readonly ok: false; readonly problems: readonly SiteProblem[] };

/**
 * What a site file means. `path` is its absolute path: relative paths are seen from its folder. No file is looked at
 * (but the program's own zone tables), so a folder or password file that does not exist is no problem here. Never throws on any text.
 */
export function loadSite(text: string, path: string): SiteAnswer {
  const original = new SiteText(text.replace(/^\uFEFF/, ''));
  const yaml = readYaml(original);
  const reading = new Reading(original, yaml, homesOfKeys);
  let site: Site | null = null;
  if (yaml.root !== null) {
    const read = siteShape.read(yaml.root, 'the site file', reading);
    const build: Build = { reading, absolute: (written) => resolve(dirname(path), written), zoneTable };
    site = read === null ? null : buildSite(build, read.value.keys, path, text);
  } else if (original.problems().length === 0) {
    original.problem(
      { from: 0, to: 0 },
      'the site file is empty',
      'begin with: site: NAME, or let draft write one',
    );
  }
  const problems = original.problems();
  if (problems.length > 0 || site === null) return { ok: false, problems };
  return { ok: true, site: deepFreeze({ ...site, warnings: original.warnings() }) };
}

/** The same from a file; a file that cannot be read is one problem in line 1. */
export function loadSiteFile(path: string): SiteAnswer {
  const file = resolve(path);
  try {
    if (statSync(file).size > 4 * mostCharacters) return loadSite(' '.repeat(mostCharacters + 1), file);
    return loadSite(readFileSync(file, 'utf8'), file);
  } catch (error) {
    const missing = error instanceof Error && 'code' in error && error.code === 'ENOENT';
    const what = missing
      ? 'there is no such file'
      : `cannot be read (${error instanceof Error ? error.message : error})`;
    const right = 'name the site file by --site FILE, or let draft write one';
    return { ok: false, problems: [{ line: 1, column: 1, what, right }] };
  }
}

/** One line a problem: `file:line:column: what is wrong; what would be right`. */
export function formatProblems(file: string, problems: readonly SiteProblem[]): readonly string[] {
  return problems.map((problem) => formatProblem(file, problem));
}

const tables = new Map<ZoneStandard, ZoneTable>();

/** A table of the program's own; they lie beside `src` and beside `dist`. */
function zoneTable(standard: ZoneStandard): ZoneTable {
  const known = tables.get(standard);
  if (known !== undefined) return known;
  const table = readZoneTable(
    readFileSync(new URL(`../../config/zones/${standard}.json`, import.meta.url), 'utf8'),
  );
  tables.set(standard, table);
  return table;
}

/** Null where a required part was refused; its problem is told then. */
function buildSite(build: Build, keys: WrittenSite, file: string, text: string): Site | null {
  const built = buildMachines(build, keys);
  const machines = built.map(({ machine }) => machine);
  tellDoubleClaims(build, built);
  tellOtherLayouts(build, built);
  const mail = buildMail(build, keys.mail?.value === undefined ? null : keys.mail, machines);
  const summary = buildSummary(build, keys, mail, machines);
  const folders = buildFolders(build, keys);
  tellNoMail(build, keys);
  if (keys.site === null || keys.time_zone === null || folders === null) return null;
  return {
    name: keys.site.value,
    timeZone: keys.time_zone.value,
    file,
    configVersion: createHash('sha256').update(text).digest('hex'),
    folders: folders.folders,
    machines,
    mail,
    summary,
    page: keys.page?.value.keys.listen?.value ?? null,
    timings: buildTimings(keys),
    shelveAtMostMs: valueOr(keys.shelve_at_most, 7 * 86_400_000),
    ...(keys.alarm_budget === null ? {} : { alarmBudget: keys.alarm_budget.value }),
    largestFileBytes: folders.largestFileBytes,
    warnings: [],
  };
}

function buildFolders(
  { reading, absolute }: Build,
  { folders }: WrittenSite,
): Pick<Site, 'folders' | 'largestFileBytes'> | null {
  if (folders === null) return null;
  const { keys } = folders.value;
  if (keys.drop === null || keys.data === null) return null;
  const drop = absolute(keys.drop.value);
  const data = absolute(keys.data.value);
  if (!relative(drop, data).startsWith('..') && relative(drop, data) !== data) {
    const what = 'the data folder lies in the drop folder, so its archive would be read again';
    reading.problem(keys.data.at, what, 'write: data: ./data, beside the drop folder');
  }
  return {
    folders: { drop, data, afterReading: valueOr(keys.after_reading, 'archive') },
    largestFileBytes: valueOr(keys.largest_file, 4e9),
  };
}

function buildTimings({ folders, recordings }: WrittenSite): IntakeTimings {
  const intake = recordings?.value.keys;
  return {
    incompleteAfterMs: intake?.incomplete_after?.value ?? 600_000,
    unassignedAfterMs: intake?.unassigned_after?.value ?? 7 * 86_400_000,
    clockToleranceMs: intake?.clock_tolerance?.value ?? 300_000,
    backlogQuietMs: intake?.backlog_quiet?.value ?? 60_000,
    backlogWaitMs: intake?.backlog_wait?.value ?? 900_000,
    sweepEveryMs: folders?.value.keys.sweep_every?.value ?? 120_000,
    polling: folders?.value.keys.polling?.value ?? false,
  };
}

function tellNoMail({ reading }: Build, { mail, site }: WrittenSite): void {
  const at = site?.at ?? { from: 0, to: 0 };
  if (mail === null) reading.warn(at, 'without mail: nobody is told of an alarm');
}

/** Frozen all the way down, so that no block can change what another reads. */
function deepFreeze<T>(value: T): T {
  if (typeof value === 'object' && value !== null && !Object.isFrozen(value)) {
    Object.freeze(value);
    for (const part of Object.values(value)) deepFreeze(part);
  }
  return value;
}
