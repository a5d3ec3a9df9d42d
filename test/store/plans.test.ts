/** Questions that are asked with every recording or mail stay cheap however old the ledger grows. */
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, it, onTestFinished, vi } from 'vitest';
import { missingOf } from '../../src/service/beyond-ledger.ts';
import { alarmsArrived, floodsSince, hasMessages, standingFlood } from '../../src/store/floods.ts';
import { lastGoodRms } from '../../src/store/good-signals.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { isLedgerRefusal } from '../../src/store/ledger-error.ts';
import { PreparedConnection, type Reader } from '../../src/store/lent-connection.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { openLedger } from '../../src/store/open-ledger.ts';
import { lastUnflaggedMs } from '../../src/store/past-levels.ts';
import { findTakenByContent } from '../../src/store/recordings.ts';
import {
  acknowledgedLives,
  unacknowledgedTold,
  untoldReminders,
  waitingReminders,
} from '../../src/store/tellings.ts';
import { openThreads } from '../../src/store/thread-ends.ts';
import { countRefusedSince, lastAcceptedMs, refusedRecipients } from '../../src/store/waiting-mail.ts';

type Ask = (ledger: Ledger) => Promise<unknown>;

const reading =
  (ask: (reader: Reader) => Promise<unknown>): Ask =>
  (ledger) =>
    ledger.read(ask);

/** How SQLite goes about what `ask` asks, without statistics, as the service never gathers any. */
async function planOf(ask: Ask): Promise<string> {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-plans-'));
  onTestFinished(() => rmSync(folder, { recursive: true, force: true }));
  const ledger = await openLedger({ folder, mode: 'owner', wallMs: () => 0, monotonicMs: () => 0 });
  if (isLedgerRefusal(ledger)) throw new Error(ledger.reason);
  const asked = vi.spyOn(PreparedConnection.prototype, 'run');
  await ask(ledger);
  const [{ sql, parameters }] = asked.mock.calls[0] as Parameters<PreparedConnection['run']>;
  asked.mockRestore();
  const connection = new Database(ledger.path, { readonly: true });
  const rows = connection.prepare(`explain query plan ${sql}`).all(...parameters) as { detail: string }[];
  connection.close();
  await ledger.close();
  return rows.map(({ detail }) => detail).join('; ');
}

const filed = {
  from: 'a.wav',
  to: null,
  sha256: 'a',
  sidecarSha256: null,
  arrivedMs: 0,
  outcome: 'taken',
} as const;

it.each<[string, Ask, string]>([
  [
    'the usual signal of a point that has been flagged for years',
    reading((reader) => lastGoodRms(reader, 1, 20)),
    'SEARCH measurements USING INDEX measurement_unflagged (point_id=?)',
  ],
  [
    'when a point was last sound',
    reading((reader) => lastUnflaggedMs(reader, 1, 1)),
    'SEARCH measurements USING COVERING INDEX measurement_unflagged (point_id=? AND used_ms<?)',
  ],
  [
    'when a mail was last accepted',
    reading((reader) => lastAcceptedMs(reader)),
    'SEARCH deliveries USING COVERING INDEX delivery_by_state (state=? AND last_try_ms>?)',
  ],
  [
    'how many mails were refused lately',
    reading((reader) => countRefusedSince(reader, 1)),
    'SEARCH deliveries USING COVERING INDEX delivery_by_state (state=? AND last_try_ms>?)',
  ],
  [
    'whether a recipient is refused',
    reading((reader) => refusedRecipients(reader, ['somebody@trial.example'])),
    'SEARCH deliveries USING INDEX delivery_by_recipient (recipient=? AND last_try_ms>?)',
  ],
  [
    'a recording of the same content',
    reading((reader) => findTakenByContent(reader, 1, 'a')),
    'SEARCH recordings USING INDEX recording_by_content (content_sha256=?)',
  ],
  [
    'what the ledger knows of files that were filed',
    (ledger) => missingOf(ledger, Array(500).fill(filed)),
    'SEARCH recordings USING INDEX recording_by_content (content_sha256=?); USE TEMP B-TREE FOR ORDER BY',
  ],
  [
    'which threads are open',
    reading((reader) => openThreads(reader)),
    'SCAN threads USING INDEX thread_open; USE TEMP B-TREE FOR ORDER BY',
  ],
  [
    'how many alarms came lately',
    reading((reader) => alarmsArrived(reader, { afterMs: 0, toMs: 1 })),
    'USE TEMP B-TREE FOR count(DISTINCT); SEARCH to_tell USING INDEX event_by_wall (wall_ms>? AND wall_ms<?)',
  ],
  [
    'whether a flood stands',
    reading((reader) => standingFlood(reader)),
    'SEARCH floods USING INDEX flood_by_end (ended_ms=?)',
  ],
  [
    'floods that may concern what waits',
    reading((reader) => floodsSince(reader, 1)),
    'SEARCH floods USING INDEX flood_by_end (ended_ms>?)',
  ],
  [
    'whether a mail of a flood was made',
    reading((reader) => hasMessages(reader, 'flood:1')),
    'SEARCH messages USING COVERING INDEX message_by_group (group_key=?)',
  ],
  [
    'what nobody has acknowledged',
    reading((reader) => unacknowledgedTold(reader)),
    'SCAN life USING INDEX alarm_unended; SEARCH event USING INDEX event_by_number (number=?)',
  ],
  [
    'what somebody has acknowledged',
    reading((reader) => acknowledgedLives(reader)),
    'SCAN alarms USING INDEX alarm_unended',
  ],
  [
    'reminders that wait to be told',
    reading((reader) => untoldReminders(reader)),
    'SCAN to_tell USING INDEX event_untold',
  ],
  [
    'reminders that wait for the server',
    reading((reader) => waitingReminders(reader)),
    'SEARCH deliveries USING INDEX delivery_by_state (state=?); SEARCH event USING INDEX event_by_message (message_id=?); USE TEMP B-TREE FOR ORDER BY',
  ],
  [
    'what is to be told',
    reading((reader) => untoldEvents(reader, 5)),
    'SCAN to_tell USING INDEX event_untold; USE TEMP B-TREE FOR ORDER BY',
  ],
])('%s is looked up, not searched for', async (_what, ask, plan) => {
  expect(await planOf(ask)).toBe(plan);
});
