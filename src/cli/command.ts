import type { Writable } from 'node:stream';
import type { Command } from 'commander';
import type { Clock } from '../service/clock.ts';

/** What a command may touch of the outside; tests hand in their own. */
export interface CommandIo {
  readonly out: Writable;
  readonly err: Writable;
  readonly workingFolder: string;
  /** The system's where it is not given. */
  readonly clock?: Clock;
}

/** 0 done; 1 something could not be done; 2 usage or site file wrong. */
export type ExitStatus = 0 | 1 | 2;

/** A command file: help with an example, options, then the run. `done` takes the exit status. */
export type AddCommand = (program: Command, io: CommandIo, done: (status: ExitStatus) => void) => void;
