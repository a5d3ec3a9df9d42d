import { readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import type { Clock } from './clock.ts';
import type { Complaints } from './log.ts';

/** What the service says of itself, for `status`: written after every round, read by other processes. */
export interface Health {
  readonly pid: number;
  /** Wall time at which this run began. */
  readonly startedMs: number;
  /** Wall time of the last finished round, or decision within a long one; an old one means that the service is stuck. */
  readonly roundMs: number;
  readonly configVersion: string;
  readonly dropFolder: 'read' | 'missing' | 'unreadable';
  readonly filesWaiting: number;
  readonly filesUnfiled: number;
  /** Paths in the drop folder that no point takes, at most twenty. */
  readonly unassigned: readonly string[];
  readonly unassignedCount: number;
  readonly workers: number;
  readonly walBytes: number;
  readonly ledgerDamage: string | null;
}

const fileName = 'service.json';

/** A service that has not finished a round for so long is stuck. */
export const stuckAfterMs = 120_000;

/** A long round says so often that it goes on. */
const aliveEveryMs = 10_000;

export class HealthFile {
  readonly #clock: Clock;
  readonly #complaints: Complaints;
  #last: { readonly folder: string; readonly health: Omit<Health, 'roundMs'> } | null = null;
  #writtenMs = Number.NEGATIVE_INFINITY;

  constructor(clock: Clock, complaints: Complaints) {
    this.#clock = clock;
    this.#complaints = complaints;
  }

  /** A round is finished. A disk that takes no file is complained about, not the end. */
  write(dataFolder: string, health: Omit<Health, 'roundMs'>): void {
    this.#last = { folder: dataFolder, health };
    this.#writtenMs = this.#clock.monotonicMs();
    const file = join(dataFolder, fileName);
    try {
      writeFileSync(
        `${file}.part`,
        `${JSON.stringify({ ...health, roundMs: Math.round(this.#clock.wallMs()) })}\n`,
      );
      renameSync(`${file}.part`, file);
    } catch (error) {
      this.#complaints.say('health', `the service's state cannot be written: ${(error as Error).message}`);
    }
  }

  /** Something was decided inside a round. */
  alive(): void {
    if (this.#last === null || this.#clock.monotonicMs() - this.#writtenMs < aliveEveryMs) return;
    this.write(this.#last.folder, this.#last.health);
  }
}

/** Null where no service has run on this folder, or its file cannot be read. */
export function readHealth(dataFolder: string): Health | null {
  try {
    return JSON.parse(readFileSync(join(dataFolder, fileName), 'utf8')) as Health;
  } catch {
    return null;
  }
}
