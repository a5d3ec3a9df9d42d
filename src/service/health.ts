import { readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/** What the service says of itself, for `status`: written after every round, read by other processes. */
export interface Health {
  readonly pid: number;
  /** Wall time at which this run began. */
  readonly startedMs: number;
  /** Wall time of the last finished round; an old one means that the service is stuck. */
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

export function writeHealth(dataFolder: string, health: Health): void {
  const file = join(dataFolder, fileName);
  writeFileSync(`${file}.part`, `${JSON.stringify(health)}\n`);
  renameSync(`${file}.part`, file);
}

/** Null where no service has run on this folder, or its file cannot be read. */
export function readHealth(dataFolder: string): Health | null {
  try {
    return JSON.parse(readFileSync(join(dataFolder, fileName), 'utf8')) as Health;
  } catch {
    return null;
  }
}
