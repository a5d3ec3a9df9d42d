import { expect, it } from 'vitest';
import { insertMessage } from '../../src/store/messages.ts';
import { emptyOldMail } from '../../src/store/old-mail.ts';
import { keepSummary } from '../../src/store/summaries.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

const states = ['accepted', 'failed', 'superseded', 'waiting'] as const;

it('empties what old mails and summaries said, slice by slice, and neither what waits nor what is new', async () => {
  const ledger = await opened(temporaryFolder());
  await ledger.transact(async (writer) => {
    for (let number = 0; number < 240; number++) {
      const createdMs = number < 160 ? 1_000 : 9_000;
      await insertMessage(writer, {
        kind: 'alarm',
        identity: `message ${number}`,
        priority: 1,
        groupKey: 'site',
        threadId: null,
        subject: 'trial',
        createdMs,
        notBeforeMs: 0,
        tells: [],
        deliveries: [
          { recipient: 'a@trial.example', mailId: `<${number}>`, bytes: new Uint8Array(9), dueMs: createdMs },
        ],
      });
      const state = states[number % 4] as string;
      const tried = state === 'superseded' ? null : createdMs;
      await writer
        .updateTable('deliveries')
        .set({ state, last_try_ms: tried })
        .where('mail_id', '=', `<${number}>`)
        .execute();
      await keepSummary(writer, {
        localDate: `day ${number}`,
        createdMs,
        messageId: null,
        html: '<p>trial</p>',
        facts: '{}',
      });
    }
  });
  let slices = 0;
  const rule = { mailBeforeMs: 5_000, summaryBeforeMs: 5_000 };
  const between = async () => {
    slices++;
  };
  // 120 mails by 50, 160 summaries by 20.
  expect(await emptyOldMail(ledger, rule, between)).toBe(120 + 160);
  expect(slices).toBe(3 + 8);
  expect(await emptyOldMail(ledger, rule, between)).toBe(0);
  const mails = await ledger.read((reader) => reader.selectFrom('deliveries').selectAll().execute());
  for (const { mail_id, state, bytes } of mails) {
    const isOld = Number(mail_id.slice(1, -1)) < 160;
    expect(bytes.length).toBe(isOld && state !== 'waiting' ? 0 : 9);
  }
  const summaries = await ledger.read((reader) => reader.selectFrom('summaries').selectAll().execute());
  expect(summaries.filter(({ html }) => html === '').length).toBe(160);
  expect(summaries.every(({ html, created_ms }) => (html === '') === created_ms < 5_000)).toBe(true);
});
