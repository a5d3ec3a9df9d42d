/**
 * Names of the places between two effects on the ledger's files. The store calls `step(name)` at each; in normal running it
 * does nothing, tests throw there or end the process there.
 */
export const transactionSteps = ['transaction: before commit', 'transaction: after commit'] as const;

/** Of a start that finds an older ledger, in this order; those of migrations come once a migration. */
export const openingSteps = [
  'opening: leftovers cleared',
  'opening: older ledger copied',
  'opening: copy forced to the disk',
  'opening: copy in place',
  'migration: begun',
  'migration: tables changed',
  'migration: noted as done',
  'migration: committed',
  'opening: up to date',
] as const;

export const backupSteps = [
  'backup: begun',
  'backup: copied',
  'backup: checked',
  'backup: forced to the disk',
  'backup: in place',
] as const;

export type LedgerStep = (typeof transactionSteps)[number] | (typeof openingSteps)[number];
export type BackupStep = (typeof backupSteps)[number];
