import { quickCheck } from '../store/backup.ts';
import { whatToDoWithDamage } from '../store/ledger-error.ts';
import { ledgerPath } from '../store/open-ledger.ts';

/** Runs the service, or a part of it; what nobody foresaw is looked into before it is thrown on. */
export async function orDamage<T>(
  dataFolder: string,
  work: () => Promise<T>,
): Promise<T | { readonly refused: string }> {
  try {
    return await work();
  } catch (error) {
    const damage = await damageOf(dataFolder);
    if (damage === null) throw error;
    return { refused: damage };
  }
}

/**
 * Why something failed that nobody foresaw, where the ledger's file is damaged; null where it is sound. SQLite keeps no
 * checksums: overwritten bytes may come back as rows that contradict one another, long before it says 'corrupt' itself.
 */
async function damageOf(dataFolder: string): Promise<string | null> {
  const path = ledgerPath(dataFolder);
  const found = await quickCheck(path);
  if ('refused' in found || found[0] === undefined) return null;
  return `the ledger ${path} fails its check (${found[0].replaceAll('\n', ' ')}); ${whatToDoWithDamage}`;
}
