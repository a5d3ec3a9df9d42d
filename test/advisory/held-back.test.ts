/** A mail that comes late because something held it back says what. */
import { expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import { danger, mailFacts } from './sample-facts.ts';

it.each([
  ['shelf-expired', 'The time on the shelf is over and the alarm still stands.'],
  ['unshelved', 'Taken off its shelf, and the alarm still stands.'],
  ['in-service', 'Out of service until now, and the alarm still stands.'],
  ['unsuppressed', 'Held back by design until now, and the alarm still stands.'],
] as const)('%s', (event, said) => {
  const { text } = alarmMail(mailFacts({ alarms: [{ ...danger, event }], troubles: [] }));
  expect(text.replace(/\s+/g, ' ')).toContain(said);
});
