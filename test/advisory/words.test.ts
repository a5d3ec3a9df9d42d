/** Numbers, times and foreign text as people read them. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { clip, escapeHtml, html, Markup, plain } from '../../src/advisory/escape.ts';
import { letterText } from '../../src/advisory/letter-text.ts';
import {
  changeText,
  distanceText,
  levelText,
  measuredText,
  percentText,
} from '../../src/advisory/level-words.ts';
import { durationText, momentText, shortMomentText } from '../../src/advisory/time-words.ts';
import { shortAdvice, troubleAdvice, troubleName } from '../../src/advisory/wording.ts';
import { displayUnit, usualDisplayUnit } from '../../src/config/units.ts';
import { levelOf, shaft } from './sample-facts.ts';

describe('levels', () => {
  it('stand in the display unit with their detector', () => {
    expect(levelText(5.2137e-3, usualDisplayUnit('velocity'))).toBe('5.21 mm/s r.m.s.');
    expect(levelText(1e-5, shaft.display)).toBe('28.3 µm peak to peak (derived)');
    const inch = displayUnit({ text: 'in/s', quantity: 'velocity', inSi: 0.0254 }, 'peak', true);
    expect(levelText(5.388154e-3, inch)).toBe('0.3 in/s peak (derived)');
  });

  it('of a clipped recording read at least', () => {
    expect(measuredText(levelOf(3e-3, 0, true), usualDisplayUnit('velocity'))).toBe('at least 3 mm/s r.m.s.');
  });

  it('say how far over, and which way they changed', () => {
    expect(distanceText(5.21, 4.5)).toBe('16 % over');
    expect(distanceText(3.24, 4.5)).toBe('28 % under');
    expect(distanceText(4.5, 4.5)).toBe('at the limit');
    expect(distanceText(4.51, 4.5)).toBe('0.22 % over');
    expect([changeText(1.42), changeText(0.92), changeText(1), changeText(15)]).toEqual([
      'up 42 %',
      'down 8 %',
      'unchanged',
      'up to 15 times',
    ]);
    expect(percentText(Number.POSITIVE_INFINITY)).toBe('beyond measure');
  });
});

describe('times', () => {
  it("are those of the site's zone, on both sides of a clock change", () => {
    expect(momentText(Date.UTC(2026, 9, 24, 23, 30), 'Europe/Dublin')).toBe('Sun 25 Oct 2026, 00:30');
    expect(momentText(Date.UTC(2026, 9, 25, 2, 30), 'Europe/Dublin')).toBe('Sun 25 Oct 2026, 02:30');
    expect(shortMomentText(Date.UTC(2026, 11, 31, 20), 'Asia/Kolkata')).toBe('1 Jan 01:30');
  });

  it('of a duration are said in two units at most', () => {
    const text = (seconds: number) => durationText(seconds * 1000);
    expect([0, 1, 59.6, 60, 90, 3599, 3600, 5400, 86_400, 100_000, 12 * 86_400 + 7000].map(text)).toEqual([
      'no time',
      '1 second',
      '1 minute',
      '1 minute',
      '1 minute 30 seconds',
      '59 minutes 59 seconds',
      '1 hour',
      '1 hour 30 minutes',
      '1 day',
      '1 day 4 hours',
      '12 days 2 hours',
    ]);
  });
});

describe('foreign text', () => {
  it('loses what acts unseen and keeps what is read', () => {
    expect(plain('a\u202eb\u0000c\u001b[31m')).toBe('a\ufffdb\ufffdc\ufffd[31m');
    expect(plain('one\r\ntwo\u2028three\tfour')).toBe('one two three four');
    expect(plain('\ud800x')).toBe('\ufffdx');
    expect(plain('Pumpe Süd, насос, ポンプ, 🏭')).toBe('Pumpe Süd, насос, ポンプ, 🏭');
  });

  it('is cut at whole characters, with an ellipsis', () => {
    expect(clip('🏭🏭🏭🏭', 3)).toBe('🏭🏭…');
    expect(clip('abc', 3)).toBe('abc');
  });

  it('never becomes markup', () => {
    fc.assert(
      fc.property(fc.string({ unit: 'binary' }), (text) => {
        const source = html`<p title="${text}">${text}</p>`.source;
        expect(source.match(/[<>"]/g)?.join('')).toBe('<"">' + '<>');
        expect(escapeHtml(text)).not.toMatch(/[<>"'\u0000-\u001f\u202a-\u202e\u2066-\u2069]/);
      }),
      { seed: 20261201 },
    );
  });

  it('is markup only where our own template made it', () => {
    expect(html`<b>${new Markup('<i>x</i>')}${['a', html`<br>`, '<']}${null}${3}</b>`.source).toBe(
      '<b><i>x</i>a<br>&lt;3</b>',
    );
  });
});

describe('a letter as text', () => {
  it('keeps a number and its unit on one line, and long words whole', () => {
    const word = 'x'.repeat(100);
    const text = letterText({
      lead: `${'word '.repeat(13)}12345 5.21 mm/s r.m.s., ${word} end`,
      head: 'head',
      test: false,
      blocks: [],
    });
    expect(text.split('\n')).toContain('5.21 mm/s r.m.s.,');
    expect(text.split('\n')).toContain(word);
    expect(text.endsWith('head\n')).toBe(true);
  });
});

describe('trouble', () => {
  it('of every kind says what to do, shortly in the summary', () => {
    for (const kind of Object.keys(troubleName) as (keyof typeof troubleName)[]) {
      expect(troubleAdvice[kind].startsWith(shortAdvice(kind))).toBe(true);
      expect(shortAdvice(kind)).toMatch(/^(Check|Run|See|Set|Compare|Restart|Let|Another) .*\.$/);
      expect(shortAdvice(kind).length).toBeLessThan(160);
    }
  });
});
