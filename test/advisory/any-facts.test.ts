/** What holds for every message, whatever stands in names, reasons and answers. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { alarmMail, mailSeverity } from '../../src/advisory/alarm-mail.ts';
import type { Mail } from '../../src/advisory/facts.ts';
import { floodMail } from '../../src/advisory/flood-mail.ts';
import { catchUpMail, serviceMail, testMail } from '../../src/advisory/notices.ts';
import { morningOf, mostShown, needsPerson } from '../../src/advisory/summary.ts';
import type { SummaryFacts } from '../../src/advisory/summary-facts.ts';
import { summaryFile, summaryMail } from '../../src/advisory/summary-mail.ts';
import { shortMomentText } from '../../src/advisory/time-words.ts';
import { caution } from '../../src/advisory/wording.ts';
import { alarm, name, numbered, summary, trouble } from './random-facts.ts';
import {
  blower,
  danger,
  day,
  driveH,
  hour,
  mailFacts,
  morning,
  overdue,
  quietFacts,
  site,
  summaryFacts,
} from './sample-facts.ts';

const runs = { seed: 20261201, numRuns: 80 };
const acting =
  /[\u0000-\u0009\u000b-\u001f\u007f-\u009f\u200b\u200e\u200f\u2028-\u202e\u2066-\u2069\ufeff]|\p{Surrogate}/u;
const tagsOfOurs =
  /^\/?(!doctype html|html|head|meta|title|style|body|div|p|b|br|h2|span|table|tr|th|td)(\s[^<>]*)?$/;
const attributesOfOurs =
  /^(class|style|lang|charset|name|content|role|cellspacing|cellpadding|valign|align)$/;

function expectHarmless(mail: Mail): void {
  expect(mail.subject).not.toMatch(/[\r\n]/);
  expect(Array.from(mail.subject).length).toBeLessThanOrEqual(150);
  expect(mail.subject).not.toMatch(acting);
  expect(mail.text).not.toMatch(acting);
  expect(mail.html).not.toMatch(acting);
  // Every tag in the page, and every attribute of it, is one of our own.
  for (const [, tag] of mail.html.matchAll(/<([^>]*)>?/g)) {
    expect(tag).toMatch(tagsOfOurs);
    for (const [, attribute] of tag.matchAll(/\s([\w-]+)="[^"]*"/g))
      expect(attribute).toMatch(attributesOfOurs);
  }
  // Nothing is fetched, nothing runs.
  expect(mail.html).not.toMatch(/<(script|img|link|iframe|a|form|object|svg)\b|url\(|@import|@font-face/i);
  expect(unwrapped(mail.text)).toContain(caution);
  expect(mail.html).toContain('never replace or drive a trip');
}

const unwrapped = (text: string): string => text.replace(/\s+/g, ' ');

/** Text in the order in which HTML shows it. */
const shownBy = (source: string): string =>
  unwrapped(
    source
      .replace(/<style>.*?<\/style>|<title>.*?<\/title>/gs, '')
      .replace(/<[^>]*>/g, ' ')
      .replace(/&(lt|gt|quot|amp|#39);/g, (_, entity: string) => {
        return { lt: '<', gt: '>', quot: '"', amp: '&', '#39': "'" }[entity] as string;
      }),
  );

describe('an alarm mail', () => {
  it('is harmless and names every alarm and trouble in text and HTML', () => {
    fc.assert(
      fc.property(
        fc.array(alarm, { maxLength: 4 }),
        fc.array(trouble, { maxLength: 3 }),
        fc.oneof(fc.constant(null), name),
        name,
        (alarms, troubles, threadSubject, siteName) => {
          const facts = mailFacts({
            alarms: numbered(alarms, 70_001),
            troubles: numbered(troubles, 80_001),
            threadSubject,
            site: { ...site, name: siteName },
          });
          const mail = alarmMail(facts);
          expectHarmless(mail);
          for (const item of facts.alarms) {
            const named = `${item.severity.toUpperCase()} ${item.number}`;
            expect(unwrapped(mail.text)).toContain(named);
            expect(shownBy(mail.html)).toContain(named);
          }
          for (const { number } of facts.troubles) {
            expect(unwrapped(mail.text)).toContain(`TROUBLE ${number}`);
            expect(shownBy(mail.html)).toContain(`TROUBLE ${number}`);
          }
        },
      ),
      runs,
    );
  });

  it('has a subject that keeps severity, number, level and the count of others whatever the names', () => {
    fc.assert(
      fc.property(alarm, (random) => {
        const first = { ...random, number: 70_001, standing: 'unacknowledged' as const };
        const { subject } = alarmMail(mailFacts({ alarms: [first], troubles: [] }));
        expect(subject.startsWith(`${first.severity.toUpperCase()} 70001: `)).toBe(true);
        expect(subject.endsWith(' mm/s r.m.s.')).toBe(true);
        const others = alarmMail(mailFacts({ alarms: [first, { ...first, number: 70_002 }] })).subject;
        expect(others.endsWith(' mm/s r.m.s. (and 1 more)')).toBe(true);
      }),
      runs,
    );
  });

  it('of a flood is harmless, names every alarm and trouble, and begins with a danger where one stands', () => {
    fc.assert(
      fc.property(
        fc.array(alarm, { maxLength: 6 }),
        fc.array(trouble, { maxLength: 6 }),
        name,
        fc.record({ goesOn: fc.boolean(), over: fc.boolean() }),
        (randomAlarms, randomTroubles, siteName, { goesOn, over }) => {
          const alarms = numbered(randomAlarms, 70_001).map((one, index) => ({
            ...one,
            reminder: index === 1 ? { number: 2, toldMs: morning - hour, thenTo: [siteName] } : undefined,
          }));
          const troubles = numbered(randomTroubles, 80_001);
          const mail = floodMail({
            site: { ...site, name: siteName },
            writtenMs: morning,
            fromMs: morning - hour,
            endedMs: over ? morning : null,
            alarmsInAll: 12,
            goesOn,
            alarms,
            troubles,
          });
          expectHarmless(mail);
          for (const { severity, number } of alarms)
            for (const text of [unwrapped(mail.text), shownBy(mail.html)])
              expect(text).toContain(`${severity.toUpperCase()} ${number}`);
          for (const { number } of troubles) expect(unwrapped(mail.text)).toContain(`TROUBLE ${number}`);
          const dangers = alarms.filter(({ severity }) => severity === 'danger');
          expect(mail.subject.startsWith('DANGER')).toBe(dangers.length > 0);
          const first = /(DANGER|ALERT|TROUBLE) [78]\d{4}/.exec(unwrapped(mail.text))?.[1];
          if (dangers.length > 0) expect(first).toBe('DANGER');
        },
      ),
      runs,
    );
  });

  it('keeps the subject of its thread', () => {
    const threadSubject = 'ALERT 17: Aeration blower 1, drive end, horizontal, overall 3.1 mm/s r.m.s.';
    expect(alarmMail(mailFacts({ alarms: [danger], threadSubject })).subject).toBe(threadSubject);
  });

  it('begins with what to do, and fits a screen', () => {
    const { text } = alarmMail(mailFacts({ alarms: [danger] }));
    expect(
      unwrapped(text).startsWith(
        'Check base bolts and coupling, look for build-up on the impeller. Respond by',
      ),
    ).toBe(true);
    expect(text.trimEnd().split('\n').length).toBeLessThanOrEqual(50);
    expect(unwrapped(text).endsWith(`${caution} `)).toBe(true);
  });

  it('says things in the order in which one asks', () => {
    const { text, html } = alarmMail(mailFacts({ alarms: [danger] }));
    const order = [
      'DANGER 17',
      'Level 5.21',
      'Limit danger 4.5',
      'alert 2.8',
      'Since Mon 30 Nov 2026, 21:00',
      '4 recordings',
      'Before 4.71',
      'a day ago 2.9',
      'a week ago 2.1',
      'baseline 1.8',
      'Lines up',
      'Lines not up',
      'Other points',
      'Recording Tue 1 Dec',
      '2971 rpm (from the sidecar',
      'load 80 %',
      'worth 28.7 independent',
      'no quality flags',
      'alarms acknowledge 17 --by NAME',
      'Caution:',
    ];
    for (const shown of [unwrapped(text), shownBy(html)]) {
      const places = order.map((words) => shown.indexOf(words));
      expect(places).not.toContain(-1);
      expect(places).toEqual([...places].sort((a, b) => a - b));
    }
  });

  it('knows its worst severity', () => {
    expect(mailSeverity({ alarms: [], troubles: [] })).toBeNull();
    expect(mailSeverity({ alarms: [{ ...danger, severity: 'alert' }, danger], troubles: [] })).toBe('danger');
  });
});

describe('the summary', () => {
  it('is harmless, and its text carries every finding and every row', () => {
    fc.assert(
      fc.property(summary, (facts) => {
        const mail = summaryMail(facts);
        expectHarmless(mail);
        const text = unwrapped(mail.text);
        const shown = shownBy(mail.html);
        for (const { number } of [...facts.standing, ...facts.limitsRemoved]) {
          expect(text).toContain(` ${number} `.trimEnd());
          expect(shown).toContain(String(number));
        }
        for (const section of morningOf(facts).sections) {
          for (const finding of section.findings) {
            for (const words of [finding.text, ...finding.also, finding.since ?? '']) {
              expect(text).toContain(unwrapped(words).trim());
            }
          }
        }
      }),
      runs,
    );
  });

  it('sorts every standing alarm into exactly one section', () => {
    fc.assert(
      fc.property(summary, (facts) => {
        const sections = morningOf(facts).sections;
        const said = (section: string) =>
          JSON.stringify(sections.find(({ name: known }) => known === section)?.findings);
        for (const item of facts.standing) {
          const needs = needsPerson(item, facts.writtenMs);
          expect(said('needs').includes(String(item.number))).toBe(needs);
          expect(said('known').includes(String(item.number))).toBe(!needs);
        }
      }),
      runs,
    );
  });

  it('has its sections in order, five findings each on the screen, the caution after them', () => {
    const many = numbered(
      Array.from({ length: 9 }, (_, index) => ({ ...danger, machine: { ...blower, id: `m${index}` } })),
      101,
    );
    const facts = { ...summaryFacts, standing: many, points: [] };
    const text = unwrapped(summaryMail(facts).text);
    const titles = [
      'NEEDS A PERSON TODAY',
      'And 4 more, listed below.',
      'WORSE, NO LIMIT PASSED',
      'ALREADY KNOWN',
      'STEADY OR BETTER',
      'RECORDINGS',
      'ALARMS ',
      'THE SERVICE',
      'Caution:',
      'NEEDS A PERSON TODAY, THE OTHERS',
      'DANGER 109',
    ];
    const places = titles.map((title) => text.indexOf(title));
    expect(places).not.toContain(-1);
    expect(places).toEqual([...places].sort((a, b) => a - b));
    const screen = text.slice(0, text.indexOf('Caution:'));
    expect(screen.match(/■ DANGER/g)).toHaveLength(mostShown);
  });

  it('says of which recording a level is, where a newer one of the standing machine came', () => {
    const [row] = quietFacts.points;
    if (row === undefined) throw new Error('the sample has no point');
    const stopped = (lastMs: number): SummaryFacts => ({
      ...quietFacts,
      points: [{ ...row, judging: 'stopped', lastMs }],
    });
    const levelMs = row.bands[0]?.level?.usedMs ?? Number.NaN;
    const older = ` of ${shortMomentText(levelMs, quietFacts.site.timeZone)} `;
    expect(unwrapped(summaryMail(stopped(levelMs + hour)).text)).toContain(older);
    expect(unwrapped(summaryMail(stopped(levelMs)).text)).not.toContain(older);
  });

  it('claims that nothing rose only where there was something to compare', () => {
    const without = quietFacts.points.map((point) => ({
      ...point,
      bands: point.bands.map((band) => ({ ...band, change: null })),
    }));
    const said = (facts: SummaryFacts) =>
      morningOf(facts)
        .sections.find(({ name }) => name === 'worse')
        ?.lines.join();
    expect(said(quietFacts)).toBe('Nothing rose by more than its ordinary spread.');
    expect(said({ ...quietFacts, points: without })).toBe('There is nothing to compare yet.');
  });

  it('begins with who needs a person, and what could not be judged', () => {
    expect(morningOf(summaryFacts).first).toBe(
      '3 machines and 1 trouble of logger, files or service need a person today; 4 of 7 points judged, ' +
        '1 without a limit, 2 blind: Sludge pump 2, drive end, horizontal (dead sensor); ' +
        'Vent fan 3, non-drive end, horizontal (overdue).',
    );
    expect(morningOf(quietFacts).first).toBe('No machine needs a person today; 2 of 2 points judged.');
  });

  it('makes one finding of several directions of one bearing', () => {
    const [needs] = morningOf(summaryFacts).sections;
    expect(needs?.findings.map(({ number }) => number)).toEqual([17, 21, 19, 20]);
    expect(needs?.findings[0]?.also.join()).toContain('Also ALERT 18, vertical');
  });

  it('leaves to people what they have taken in hand, until it gets worse or its time has passed', () => {
    const known = { ...danger, standing: 'acknowledged' as const, change: null, respondByMs: null };
    expect(needsPerson(known, morning)).toBe(false);
    expect(needsPerson({ ...known, respondByMs: morning - 1 }, morning)).toBe(true);
    expect(needsPerson({ ...known, change: { ratio: 2, ordinaryRatio: 1.1, worse: true } }, morning)).toBe(
      true,
    );
    expect(needsPerson({ ...known, dangerUnconfirmed: true }, morning)).toBe(true);
    expect(needsPerson({ ...known, standing: 'shelved', dangerUnconfirmed: true }, morning)).toBe(false);
    expect(needsPerson({ ...known, standing: 'returned-unacknowledged' }, morning)).toBe(true);
  });

  it('of a site whose network failed names hundreds of overdue points and stays under 300 kB', () => {
    const many = Array.from({ length: 600 }, (_, index) => ({
      ...overdue,
      number: 1000 + index,
      machine: { ...blower, id: `m${index}` },
    }));
    const mail = summaryMail({ ...summaryFacts, standing: many });
    expect(Buffer.byteLength(mail.html)).toBeLessThan(300_000);
    for (const { number } of many) expect(mail.text).toContain(`TROUBLE ${number}`);
  });

  it('of a large site stays under 300 kB as a mail and is complete as a file', () => {
    const row = quietFacts.points[0];
    if (row === undefined) throw new Error('the sample has no point');
    const points = Array.from({ length: 1000 }, (_, index) => ({
      ...row,
      point: { ...driveH, id: `p${index}`, name: `${'long name '.repeat(5)} ${index}` },
    }));
    const facts = { ...quietFacts, points };
    const mail = summaryMail(facts);
    expect(Buffer.byteLength(mail.html)).toBeLessThan(300_000);
    expect(mail.text).toContain('And 1200 rows more in data/summary/latest.html.');
    expect(summaryFile(facts).match(/<tr>/g)).toHaveLength(2001);
  });
});

describe('the rarer mails', () => {
  it('are harmless', () => {
    fc.assert(
      fc.property(name, name, trouble, (one, two, item) => {
        const hostile = { name: one, timeZone: 'Europe/Dublin' };
        const base = { site: hostile, writtenMs: morning };
        const passed = {
          number: 70_001,
          severity: 'alert' as const,
          machine: item.machine,
          point: item.point,
          band: { ...danger.band, id: two },
          highest: 3e-3,
          trouble: null,
          beganMs: morning - day,
          endedMs: morning,
        };
        const mails = [
          catchUpMail({
            ...base,
            reason: 'mail-waited',
            fromMs: morning - day,
            toMs: morning,
            recordings: 3,
            passed: [passed],
          }),
          serviceMail({
            ...base,
            kind: 'message-failed',
            subject: one,
            recipient: two,
            answer: one,
            triedMs: morning,
          }),
          serviceMail({
            ...base,
            kind: 'start-with-older-ledger',
            machines: 1,
            points: 1,
            limits: 0,
            pointsWithoutLimit: [one, two],
            recipients: 1,
            summaryAt: '06:30',
            dropFolder: two,
            lastSeenMs: null,
            takenAgain: 3,
            lostActs: [{ wallMs: morning, by: one, command: one }],
          }),
          testMail({ ...base, from: one, to: [two], server: one, points: 1, limits: 1 }),
        ];
        for (const mail of mails) expectHarmless(mail);
        expect(mails[0]?.text).toContain('ALERT 70001');
        expect(mails[3]?.text.startsWith('TEST: ')).toBe(true);
        expect(mails[3]?.subject.startsWith('TEST: ')).toBe(true);
      }),
      runs,
    );
  });
});
