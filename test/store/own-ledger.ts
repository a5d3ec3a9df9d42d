import { isLedgerRefusal } from '../../src/store/ledger-error.ts';
import { openLedger } from '../../src/store/open-ledger.ts';

/** A process of its own that owns the ledger of a folder until it is killed; says so on its output. */
const ledger = await openLedger({
  folder: process.argv[2] ?? '',
  mode: 'owner',
  wallMs: () => Date.now(),
  monotonicMs: () => performance.now(),
});
if (isLedgerRefusal(ledger)) {
  process.stdout.write(`refused: ${ledger.reason}\n`);
} else {
  await ledger.transact(async (writer) => {
    await writer.insertInto('told_once').values({ key: 'child', wall_ms: 1 }).execute();
  });
  process.stdout.write('owns\n');
  process.stdin.resume();
}
