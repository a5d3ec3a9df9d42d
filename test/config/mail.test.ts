/** Who gets which mail when, as the site file says it; and what `check` warns of. */
import { describe, expect, it } from 'vitest';
import { complaints, exampleWith, siteOf } from './site-parts.ts';

const recipient = '  to:\n    - address: maintenance@larkfen.example\n\nsummary:';
const mail = (more: string, to = '    - address: maintenance@larkfen.example\n') =>
  exampleWith([recipient, `${more}  to:\n${to}\nsummary:`]);
const warnings = (text: string) => siteOf(text).warnings.map((one) => one.text);

describe('mail', () => {
  it('says nothing of the night and reminders: nothing is held, reminders are as usual', () => {
    const site = siteOf(mail(''));
    expect(site.mail?.holdDuring ?? null).toBeNull();
    expect(site.mail?.reminders).toEqual({ thenTo: [], thenAfter: { reminders: 2 } });
    expect(site.machines[0]?.points[0]?.limits[0]?.remindAfterMs).toBeUndefined();
  });

  it('holds the night, reminds, and names the next recipients', () => {
    const text = mail(
      [
        '  hold_overnight: true',
        '  night: 21:00..05:00',
        '  remind_after: 4 h',
        '  then_to: [chief@larkfen.example, works@larkfen.example]',
        '  then_after: 8 h',
        '',
      ].join('\n'),
    );
    expect(siteOf(text).mail).toMatchObject({
      holdDuring: { fromMinute: 1260, toMinute: 300 },
      reminders: {
        afterMs: 4 * 3_600_000,
        thenTo: ['chief@larkfen.example', 'works@larkfen.example'],
        thenAfter: { ms: 8 * 3_600_000 },
      },
    });
    expect(warnings(text)).toEqual([]);
    expect(siteOf(mail('  hold_overnight: true\n')).mail?.holdDuring?.text).toBe('22:00..06:00');
    expect(siteOf(mail('  remind_after: never\n')).mail?.reminders?.afterMs).toBeNull();
  });

  it('of a limit goes before that of mail', () => {
    const text = exampleWith([
      'say_again_at: +25 %',
      'say_again_at: +25 %\n        say_again_after: 7 d\n        remind_after: never\n        then_to: [chief@larkfen.example]',
    ]);
    expect(siteOf(text).machines[0]?.points[0]?.limits[0]).toMatchObject({
      sayAgainAfterMs: 7 * 86_400_000,
      remindAfterMs: null,
      thenTo: ['chief@larkfen.example'],
    });
  });

  it('refuses hours that are none, with those that were meant', () => {
    const [complaint] = complaints(mail('', '    - address: ann@larkfen.example\n      hours: 6-22\n'));
    expect(complaint).toMatch(/'6-22' is no hours such as .*; write: hours: '06:00\.\.22:00'/);
    expect(complaints(mail('  remind_after: 1 min\n'))[0]).toMatch(/is not from 5 min to 30 d/);
  });
});

describe('a warning', () => {
  const two = (a: string, b: string) =>
    mail('', `    - address: ann@larkfen.example\n${a}    - address: ben@larkfen.example\n${b}`);

  it('names hours that nobody has, and what becomes of mails in them', () => {
    expect(warnings(two('      hours: mon..fri 06:00..18:00\n', '      hours: 18:00..06:00\n'))).toEqual([
      'nobody has hours for any machine from sat 06:00 to sat 18:00, sun 06:00 to sun 18:00: alert and trouble wait until it is over; danger then goes to everybody, whatever their hours',
    ]);
    expect(warnings(two('      hours: 06:00..18:00\n', '      hours: 18:00..06:00\n'))).toEqual([]);
    expect(warnings(two('      hours: mon\n', ''))).toEqual([]);
  });

  it('names machines and severities that nobody takes', () => {
    expect(warnings(two('      severities: [danger]\n', '      severities: [alert]\n'))).toEqual([
      'nobody is told of trouble of any machine',
    ]);
  });

  it('names words that do nothing', () => {
    expect(warnings(mail('  night: 22:00..06:00\n'))).toEqual([
      'night without hold_overnight: true holds nothing back',
    ]);
    expect(warnings(mail('  hold_overnight: true\n  night: mon..sun\n'))).toEqual([
      'a night without a morning holds nothing back',
    ]);
    expect(warnings(mail('  then_after: 3 reminders\n'))).toEqual([
      'then_after without then_to tells nobody',
    ]);
    expect(warnings(mail('  remind_after: never\n  then_to: [chief@larkfen.example]\n'))).toEqual([
      'then_to with remind_after: never tells nobody: they join a reminder',
    ]);
  });
});
