import { addNote } from '../../service/machine-acts.ts';
import { breakingKinds, type NoteKind, noteKinds } from '../../store/notes.ts';
import type { AddCommand, CommandIo, ExitStatus } from '../command.ts';
import { fail, misused, wallMs, withLedger, withSite } from '../open.ts';
import { ownText, textsProblem } from '../person.ts';
import { findPlace } from '../site-names.ts';
import { parseWhen, timeText } from '../when.ts';

interface NoteOptions {
  readonly site: string;
  readonly by: string;
  readonly at?: string;
  readonly comment?: string;
  readonly found?: string;
}

/** `note`: what was done to a machine. */
export const addNoteCommand: AddCommand = (program, io, done) => {
  program
    .command('note')
    .description('records what was done to a machine or measuring point')
    .argument('<machine[/point]>', 'machine, or one of its measuring points')
    .argument('<kind>', noteKinds.join(', '))
    .option('--site <file>', 'site file', './site.yaml')
    .requiredOption('--by <name>', 'who says so')
    .option('--at <when>', "when it was done: a date, a time, or a time back such as '2 h' (default: now)")
    .option('--comment <text>', 'what was done')
    .option('--found <text>', 'what was found')
    .addHelpText(
      'after',
      "\nAfter repair and sensor-changed the baseline begins anew, and no trend reaches across.\n\nExample:\n  humledger note blower-1 repair --at '2026-03-02 14:00' --by 'A. Fitter' \\\n    --comment 'drive end bearing replaced' --found 'outer ring pitted'",
    )
    .action(async (path: string, kind: string, options: NoteOptions) => {
      done(await note(path, kind, options, io));
    });
};

function note(path: string, kindText: string, options: NoteOptions, io: CommandIo): Promise<ExitStatus> {
  return withSite(io, options.site, ({ site }) => {
    const kind = noteKinds.find((known) => known === kindText);
    if (kind === undefined)
      return Promise.resolve(misused(io, `'${kindText}' is none of ${noteKinds.join(', ')}`));
    const by = ownText(options.by) ?? '';
    const [comment, found] = [ownText(options.comment), ownText(options.found)];
    const wrong = textsProblem({ by, comment, found });
    if (wrong !== null) return Promise.resolve(misused(io, wrong));
    const nowMs = wallMs(io);
    const at = options.at === undefined ? null : parseWhen(options.at, nowMs, site.timeZone);
    if (at?.ok === false) return Promise.resolve(misused(io, `--at: ${at.what}`));
    const atMs = at?.value ?? nowMs;
    if (atMs > nowMs) return Promise.resolve(misused(io, '--at lies in the future'));
    const place = findPlace(site, path);
    if ('unknown' in place) return Promise.resolve(fail(io, place.unknown));
    return withLedger(io, site, 'guest', async (ledger) => {
      const person = { by, via: 'command', wallMs: nowMs } as const;
      const answer = await addNote(ledger, place, { kind, atMs, found, comment }, person);
      if ('refused' in answer) return fail(io, answer.refused);
      if (answer.note !== null) io.err.write(`note: ${answer.note}\n`);
      io.out.write(
        `${path}: ${kind} noted for ${timeText(atMs, site.timeZone)}${ended(kind, answer.baselines)}\n`,
      );
      return 0;
    });
  });
}

function ended(kind: NoteKind, baselines: number): string {
  if (!breakingKinds.includes(kind)) return '';
  const count =
    baselines === 0 ? 'what is usual is' : baselines === 1 ? '1 baseline is' : `${baselines} baselines are`;
  return `; ${count} learned anew from then on, and no trend reaches across`;
}
