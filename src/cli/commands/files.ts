import { printableName, sidecarNameOf } from '../../acquisition/file-name.ts';
import { explainMismatch, siteFiles } from '../../acquisition/file-pattern.ts';
import { type Sweep, sweepFolder } from '../../acquisition/sweep.ts';
import { durationText } from '../../advisory/time-words.ts';
import { printNumber } from '../../config/print-value.ts';
import { pointPath, type Site } from '../../config/site.ts';
import { findAside, listAside, pathItCameBy, takeAgain } from '../../service/aside-files.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, wallMs, withLedger, withSite } from '../open.ts';
import { type Row, table, writeJson } from '../output.ts';

interface FilesOptions {
  readonly site: string;
  readonly json?: boolean;
  readonly takeAgain?: string;
}

/** `files`: what lies in the drop folder, what nobody takes, what could not be used; and taking one again. */
export const addFiles: AddCommand = (program, io, done) => {
  program
    .command('files')
    .description('drop folder, unassigned and quarantine: which points take a file, or why none does')
    .option('--site <file>', 'site file', './site.yaml')
    .option('--take-again <file>', 'moves a file of quarantine or unassigned back into the drop folder')
    .option('--json', 'as JSON')
    .addHelpText(
      'after',
      '\nExamples:\n  humledger files\n  humledger files --take-again quarantine/pump-2_20260302T103000Z.wav',
    )
    .action(async (options: FilesOptions) => {
      done(
        await withSite(io, options.site, ({ site }) =>
          options.takeAgain === undefined
            ? list(site, options.json === true, io)
            : again(site, options.takeAgain, io),
        ),
      );
    });
};

/** A file of any of the three folders, with what the site file makes of its name. */
interface ListedFile {
  readonly file: string;
  readonly sizeBytes: number;
  readonly modifiedMs: number;
  readonly points: readonly string[];
  readonly ignored: boolean;
  /** Null where a point takes it, or it is ignored. */
  readonly mismatch: {
    readonly nearest: string | null;
    readonly differsAt: number | null;
    readonly text: string;
  } | null;
  readonly reason: string | null;
}

async function list(site: Site, json: boolean, io: CommandIo): Promise<ExitStatus> {
  const { drop, data } = site.folders;
  const sweep = await sweepFolder(drop, [data]);
  const lister = listerOf(site);
  const dropped = sweep.state === 'read' ? dropFiles(sweep, lister) : [];
  const aside = async (folder: 'unassigned' | 'quarantine') =>
    (await listAside(data, folder)).map((file) => lister({ ...file, path: file.name }, file.reason));
  const unassigned = await aside('unassigned');
  const quarantine = await aside('quarantine');
  const leftAlone = sweep.state === 'read' ? sweep.leftAlone : [];
  if (json) {
    writeJson(io.out, {
      drop_folder: {
        folder: drop,
        state: sweep.state,
        files: dropped.map(fileJson),
        left_alone: leftAlone.map(({ path, reason }) => ({ file: path, reason })),
      },
      unassigned: unassigned.map(fileJson),
      quarantine: quarantine.map(fileJson),
    });
  } else {
    const nowMs = wallMs(io);
    const alone = leftAlone.map(({ path, reason }): Row[] => [
      [printableName(path)],
      { beneath: `left alone: ${reason}` },
    ]);
    io.out.write(
      [
        section(`Drop folder ${drop}`, dropped, nowMs, alone.flat()),
        section(`Unassigned ${data}/unassigned`, unassigned, nowMs),
        section(`Quarantine ${data}/quarantine`, quarantine, nowMs),
      ].join('\n'),
    );
  }
  return sweep.state === 'read' ? 0 : fail(io, sweep.reason);
}

type Lister = (
  file: { readonly path: string; readonly modifiedMs: number; readonly sizeBytes: number },
  reason: string | null,
) => ListedFile;

function listerOf(site: Site): Lister {
  const files = siteFiles(site);
  return ({ path, sizeBytes, modifiedMs }, reason) => {
    const points = files.pointsFor(path).map(pointPath);
    const ignored = points.length === 0 && files.isIgnored(path);
    const mismatch = points.length > 0 || ignored ? null : explainMismatch(path, site);
    return { file: path, sizeBytes, modifiedMs, points, ignored, mismatch, reason };
  };
}

/** A sidecar goes with its recording and is not listed beside it. */
function dropFiles({ files }: Extract<Sweep, { state: 'read' }>, lister: Lister): ListedFile[] {
  const sidecars = new Set(
    files.filter(({ path }) => !path.endsWith('.json')).map(({ path }) => sidecarPath(path)),
  );
  return files
    .filter(({ path }) => !sidecars.has(path))
    .map((file) => {
      const listed = lister(
        { path: file.path, sizeBytes: file.size, modifiedMs: Math.round(file.mtimeMs) },
        null,
      );
      return file.nameProblem === null ? listed : { ...listed, mismatch: null, reason: file.nameProblem };
    });
}

function sidecarPath(path: string): string {
  const at = path.lastIndexOf('/') + 1;
  return path.slice(0, at) + sidecarNameOf(path.slice(at));
}

function fileJson(listed: ListedFile): Record<string, unknown> {
  return {
    file: listed.file,
    size_bytes: listed.sizeBytes,
    modified: new Date(listed.modifiedMs).toISOString(),
    points: listed.points,
    ignored: listed.ignored,
    nearest_pattern: listed.mismatch?.nearest ?? null,
    differs_at: listed.mismatch?.differsAt ?? null,
    mismatch: listed.mismatch?.text ?? null,
    reason: listed.reason,
  };
}

function section(
  title: string,
  files: readonly ListedFile[],
  nowMs: number,
  more: readonly Row[] = [],
): string {
  if (files.length + more.length === 0) return `${title}: empty\n`;
  const rows = files.flatMap((listed): Row[] => [
    [printableName(listed.file), size(listed.sizeBytes), age(nowMs - listed.modifiedMs)],
    ...notes(listed).map((beneath) => ({ beneath })),
  ]);
  return `${title}\n${hanging([...rows, ...more])}`;
}

/** Like a table without titles, what is beneath a file by two places. */
function hanging(rows: readonly Row[]): string {
  const columns = [{ title: 'file', wraps: true }, { title: 'size', right: true }, { title: 'changed' }];
  return table(columns, rows, 78, 2).replace(/^(?=.)/gm, '  ');
}

function notes({ points, ignored, mismatch, reason }: ListedFile): string[] {
  const taken = points.length > 0 ? [`taken by ${points.join(', ')}`] : [];
  const left = ignored ? ['ignored: hidden, unfinished, a sidecar, or named by ignore'] : [];
  return [
    ...(reason === null ? [] : [reason]),
    ...taken,
    ...left,
    ...(mismatch === null ? [] : [`no point takes it; ${mismatch.text}`]),
  ];
}

function size(bytes: number): string {
  return bytes < 1e6 ? `${printNumber(bytes / 1000)} kB` : `${printNumber(bytes / 1e6)} MB`;
}

function age(ms: number): string {
  return ms < 0 ? 'in the future' : `${durationText(ms)} ago`;
}

async function again(site: Site, written: string, io: CommandIo): Promise<ExitStatus> {
  const found = await findAside(site, written, io.workingFolder);
  if ('reason' in found) return fail(io, found.reason);
  return withLedger(io, site, 'reader', async (ledger) => {
    const to = await ledger.read((reader) => pathItCameBy(reader, found));
    if (siteFiles(site).pointsFor(to).length === 0) {
      const { text } = explainMismatch(to, site);
      return fail(io, `no point takes ${printableName(to)}, so it stays where it is; ${text}`);
    }
    const done = await takeAgain(site, found, to);
    if ('reason' in done) return fail(io, done.reason);
    io.out.write(`in the drop folder again: ${done.moved.map(printableName).join(', ')}\n`);
    return 0;
  });
}
