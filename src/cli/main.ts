import { readFileSync } from 'node:fs';
import { Command, CommanderError } from 'commander';
import type { AddCommand, CommandIo, ExitStatus } from './command.ts';
import { addAlarms } from './commands/alarms.ts';
import { addAnalyse } from './commands/analyse.ts';
import { addBackup } from './commands/backup.ts';
import { addBaseline } from './commands/baseline.ts';
import { addCheck } from './commands/check.ts';
import { addDemo } from './commands/demo.ts';
import { addDraft } from './commands/draft.ts';
import { addFiles } from './commands/files.ts';
import { addNoteCommand } from './commands/note.ts';
import { addRecordingPlan } from './commands/recording-plan.ts';
import { addRehearse } from './commands/rehearse.ts';
import { addRun } from './commands/run.ts';
import { addStatus } from './commands/status.ts';
import { addSummary } from './commands/summary.ts';
import { addTrend } from './commands/trend.ts';

/** The commands, in the order in which help names them. */
const commands: readonly AddCommand[] = [
  addRun,
  addDraft,
  addCheck,
  addAnalyse,
  addStatus,
  addFiles,
  addSummary,
  addTrend,
  addAlarms,
  addBaseline,
  addNoteCommand,
  addRehearse,
  addRecordingPlan,
  addBackup,
  addDemo,
];

const processIo: CommandIo = { out: process.stdout, err: process.stderr, workingFolder: process.cwd() };

/** Runs one command line (without the program's name); the answer is the exit status. */
export async function main(args: readonly string[], io: CommandIo = processIo): Promise<ExitStatus> {
  let status: ExitStatus = 0;
  const done = (answer: ExitStatus) => {
    status = answer;
  };
  const program = new Command('humledger')
    .description(
      'Turns recordings of rotating machines into band levels, trends, alarms and a morning summary.',
    )
    .version(version(), '--version', 'which version this is')
    .configureOutput({ writeOut: (text) => io.out.write(text), writeErr: (text) => io.err.write(text) })
    .exitOverride()
    .showHelpAfterError('(--help shows what would be right)');
  for (const add of commands) add(program, io, done);
  try {
    await program.parseAsync([...args], { from: 'user' });
    return status;
  } catch (error) {
    if (!(error instanceof CommanderError)) throw error;
    return error.exitCode === 0 ? 0 : 2;
  }
}

function version(): string {
  const manifest = readFileSync(new URL('../../package.json', import.meta.url), 'utf8');
  return (JSON.parse(manifest) as { readonly version: string }).version;
}
