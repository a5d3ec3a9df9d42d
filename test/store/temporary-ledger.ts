import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { onTestFinished } from 'vitest';
import type { Ledger } from '../../src/store/ledger.ts';
import { isLedgerRefusal } from '../../src/store/ledger-error.ts';
import { type OpenOptions, openLedger } from '../../src/store/open-ledger.ts';

/** A folder that is gone when the test is over. */
export function temporaryFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'ledger-'));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  return folder;
}

export function options(folder: string, more: Partial<OpenOptions> = {}): OpenOptions {
  return {
    folder,
    mode: 'owner',
    wallMs: () => 1_700_000_000_000,
    monotonicMs: () => 0,
    ...more,
  };
}

/** An open ledger, or the test fails with the refusal's words. */
export async function opened(folder: string, more: Partial<OpenOptions> = {}): Promise<Ledger> {
  const ledger = await openLedger(options(folder, more));
  if (isLedgerRefusal(ledger)) throw new Error(ledger.reason);
  onTestFinished(() => ledger.close());
  return ledger;
}

export async function refusal(
  folder: string,
  more: Partial<OpenOptions> = {},
): Promise<{ readonly refused: string; readonly reason: string }> {
  const answer = await openLedger(options(folder, more));
  if (isLedgerRefusal(answer)) return answer;
  await answer.close();
  throw new Error('the ledger was opened');
}
