import { existsSync, realpathSync, statSync, writeFileSync } from 'node:fs';
import { basename, dirname, join, relative, resolve } from 'node:path';
import { plain } from '../../advisory/escape.ts';
import { counted } from '../../advisory/level-words.ts';
import { loadSite } from '../../config/load.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { draftSite } from '../draft/draft-site.ts';
import { mark } from '../draft/yaml-lines.ts';
import { fail } from '../open.ts';

/** `draft FOLDER`: a first site file from what lies in a folder; never overwrites. */
export const addDraft: AddCommand = (program, io, done) => {
  program
    .command('draft')
    .description('writes a first site file from what lies in a folder; guesses are marked "please confirm"')
    .argument('<folder>', 'the folder into which the logger puts its recordings')
    .option('--out <file>', 'site file to write; never overwritten', './site.yaml')
    .addHelpText('after', '\nExample:\n  humledger draft ./drop --out site.yaml')
    .action(async (folder: string, options: { out: string }) => {
      done(await draft(folder, options.out, io));
    });
};

async function draft(folder: string, out: string, io: CommandIo): Promise<ExitStatus> {
  const drop = resolve(io.workingFolder, folder);
  const path = resolve(io.workingFolder, out);
  if (existsSync(path)) return fail(io, `${path} exists and is not overwritten; name another file by --out`);
  if (!existsSync(dirname(path)))
    return fail(io, `there is no folder ${dirname(path)} to write the site file to`);
  const paths = pathsOf(drop, path);
  const drafted = await draftSite(drop, { ...paths, siteName: nameOf(path), timeZone: systemZone() });
  if ('reason' in drafted) return fail(io, drafted.reason);
  const loaded = loadSite(drafted.text, path);
  if (!loaded.ok) {
    const [first] = loaded.problems;
    return fail(io, `no sound site file can be made from ${drop}: line ${first?.line}: ${first?.what}`);
  }
  try {
    writeFileSync(path, drafted.text, { flag: 'wx' });
  } catch (error) {
    return fail(io, `${path} cannot be written: ${(error as NodeJS.ErrnoException).code}`);
  }
  tell(path, drafted, io);
  return 0;
}

function tell(
  path: string,
  drafted: Exclude<Awaited<ReturnType<typeof draftSite>>, { reason: string }>,
  io: CommandIo,
) {
  const marks = drafted.text.split(`# ${mark}`).length - 1;
  const here = relative(io.workingFolder, path) || path;
  const { machines, points, files, leftOut } = drafted;
  io.out.write(
    `${plain(here)}: ${counted(machines, 'machine')}, ${counted(points, 'point')} from ${counted(files, 'file')}\n`,
  );
  for (const text of leftOut) io.out.write(`not taken in: ${plain(text)}\n`);
  io.out.write(
    `\nLook at the ${marks} lines marked "${mark}", add limits and mail where the hints are, then:\n`,
  );
  io.out.write(`  humledger check${here === 'site.yaml' ? '' : ` --site ${plain(here)}`}\n`);
}

/** Relative paths as the site file writes them; the data folder never inside the drop folder. */
function pathsOf(
  drop: string,
  siteFile: string,
): { readonly drop: string; readonly data: string; readonly dataPath: string } {
  const from = realpathSync(dirname(siteFile));
  const folder = existsSync(drop) && statSync(drop).isDirectory() ? realpathSync(drop) : drop;
  const data = join(from, 'data');
  const inside = !relative(folder, data).startsWith('..');
  const dataPath = inside ? `${folder}-data` : data;
  return { drop: written(from, folder), data: written(from, dataPath), dataPath };
}

function written(from: string, to: string): string {
  const path = relative(from, to).replaceAll('\\', '/');
  if (path === '') return '.';
  return path.startsWith('..') ? path : `./${path}`;
}

function nameOf(siteFile: string): string {
  return basename(dirname(siteFile)).slice(0, 100) || 'My site';
}

function systemZone(): string {
  return new Intl.DateTimeFormat().resolvedOptions().timeZone || 'UTC';
}
