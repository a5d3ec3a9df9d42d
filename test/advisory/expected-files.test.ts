/**
 * Mails and summary as people get them, byte for byte against reference files. UPDATE_EXPECTED=1 rewrites them: read
 * the difference, and commit only what you can explain.
 */
import { mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import type { Mail } from '../../src/advisory/facts.ts';
import { type FloodFacts, floodMail } from '../../src/advisory/flood-mail.ts';
import { catchUpMail, serviceMail, testMail } from '../../src/advisory/notices.ts';
import { summaryFile, summaryMail } from '../../src/advisory/summary-mail.ts';
import {
  alert,
  blower,
  danger,
  day,
  deadSensor,
  driveH,
  hour,
  levelOf,
  mailFacts,
  morning,
  overall,
  overdue,
  pump,
  quietFacts,
  site,
  summaryFacts,
  unreadable,
} from './sample-facts.ts';

const folder = join(import.meta.dirname, 'expected');
const update = process.env.UPDATE_EXPECTED === '1';

function expectFile(name: string, text: string): void {
  const file = join(folder, name);
  if (update) {
    mkdirSync(folder, { recursive: true });
    writeFileSync(file, text);
  }
  expect(text).toBe(readFileSync(file, 'utf8'));
}

const start = {
  site,
  writtenMs: morning,
  machines: 3,
  points: 7,
  limits: 12,
  pointsWithoutLimit: ['fan-3/de-h'],
  recipients: 2,
  summaryAt: '06:30',
  dropFolder: '/srv/humledger/drop',
  lastSeenMs: null,
  takenAgain: 0,
  lostActs: [],
};

/** A cable duct under water: a danger among alerts and loggers that fell silent. */
const flood: FloodFacts = {
  site,
  writtenMs: morning,
  fromMs: morning - 0.15 * hour,
  endedMs: null,
  alarmsInAll: 14,
  goesOn: false,
  alarms: [alert, danger],
  troubles: Array.from({ length: 12 }, (_, index) => ({
    ...(index % 4 === 3 ? overdue : deadSensor),
    number: 30 + index,
    machine: index % 4 === 3 ? null : pump,
    sinceMs: morning - 0.1 * hour,
  })),
};

const mails: Record<string, () => Mail> = {
  'alarm-danger': () => alarmMail(mailFacts({ alarms: [danger] })),
  'alarm-gathered': () => alarmMail(mailFacts({ alarms: [alert, danger], troubles: [deadSensor] })),
  'alarm-test': () => alarmMail(mailFacts({ alarms: [{ ...danger, event: 'raised' }], test: true })),
  'alarm-returned': () =>
    alarmMail(
      mailFacts({
        alarms: [
          { ...danger, level: levelOf(2.31e-3), standing: 'returned-unacknowledged', event: 'returned' },
        ],
      }),
    ),
  'alarm-reminder': () =>
    alarmMail(
      mailFacts({
        alarms: [
          {
            ...danger,
            event: 'reminded',
            reminder: { number: 3, toldMs: morning - 9 * hour, thenTo: ['chief@larkfen.example'] },
          },
        ],
        threadSubject: 'DANGER 17: Aeration blower 1, drive end, horizontal, overall 4.71 mm/s r.m.s.',
      }),
    ),
  'alarm-still-stands': () =>
    alarmMail(
      mailFacts({
        alarms: [
          { ...alert, event: 'still-stands', wasAcknowledged: { by: 'A. Fitter', ms: morning - 7 * day } },
        ],
      }),
    ),
  flood: () => floodMail(flood),
  'flood-over': () =>
    floodMail({
      ...flood,
      fromMs: morning - hour,
      endedMs: morning - hour / 6,
      goesOn: true,
      alarmsInAll: 17,
      alarms: [alert],
      troubles: [],
    }),
  'trouble-overdue': () => alarmMail(mailFacts({ machine: null, troubles: [overdue] })),
  'trouble-unreadable': () => alarmMail(mailFacts({ machine: null, troubles: [unreadable] })),
  summary: () => summaryMail(summaryFacts),
  'summary-quiet': () => summaryMail(quietFacts),
  'catch-up': () =>
    catchUpMail({
      site,
      writtenMs: morning,
      reason: 'backlog',
      fromMs: morning - 3 * day,
      toMs: morning - hour,
      recordings: 213,
      passed: [
        {
          number: 15,
          severity: 'alert',
          machine: blower,
          point: driveH,
          band: overall,
          highest: 3.3e-3,
          trouble: null,
          beganMs: morning - 2 * day,
          endedMs: morning - 1.5 * day,
        },
        {
          number: 16,
          severity: 'trouble',
          machine: pump,
          point: null,
          band: null,
          highest: null,
          trouble: 'clock',
          beganMs: morning - 2 * day,
          endedMs: null,
        },
      ],
    }),
  'service-first-start': () => serviceMail({ kind: 'first-start', ...start }),
  'service-unclean-stop': () =>
    serviceMail({ kind: 'start-after-unclean-stop', ...start, lastSeenMs: morning - 3.4 * hour }),
  'service-older-ledger': () =>
    serviceMail({
      kind: 'start-with-older-ledger',
      ...start,
      takenAgain: 412,
      lostActs: [{ wallMs: morning - 30 * hour, by: 'A. Fitter', command: 'acknowledge 18' }],
    }),
  'service-message-failed': () =>
    serviceMail({
      kind: 'message-failed',
      site,
      writtenMs: morning,
      subject: 'ALERT 18: Aeration blower 1, drive end, vertical, overall 3.1 mm/s r.m.s.',
      recipient: 'maintenance@larkfen.example',
      answer: '550 5.1.1 no such mailbox',
      triedMs: morning - hour,
    }),
  test: () =>
    testMail({
      site,
      writtenMs: morning,
      from: 'humledger@larkfen.example',
      to: ['maintenance@larkfen.example'],
      server: '127.0.0.1:587 (starttls)',
      points: 7,
      limits: 12,
    }),
};

describe('messages are worded exactly as the reference files show', () => {
  for (const [name, make] of Object.entries(mails)) {
    it(name, () => {
      const mail = make();
      expectFile(`${name}.txt`, `Subject: ${mail.subject}\n\n${mail.text}`);
      expectFile(`${name}.html`, mail.html);
    });
  }

  it('the summary file is the mail with every row of its tables', () => {
    expect(summaryFile(summaryFacts)).toBe(summaryMail(summaryFacts).html);
  });
});
