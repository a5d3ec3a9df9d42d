import { describe, expect, it } from 'vitest';
import { saidText } from '../../src/advisory/letter.ts';
import { letterHtml } from '../../src/advisory/letter-html.ts';
import { machineZoneNow, zoneSaid } from '../../src/advisory/zone-words.ts';
import { usualDisplayUnit } from '../../src/config/units.ts';
import { type ZoneLetter, zoneLetters } from '../../src/config/zone-tables.ts';
import { driveH, driveV, summaryFacts, zoneOf } from './sample-facts.ts';

const mmPerS = usualDisplayUnit('velocity');
const text = (...args: Parameters<typeof zoneOf>) => saidText(zoneSaid(zoneOf(...args), mmPerS));

describe('zones in words', () => {
  it('name the letter, the table and the boundaries beside it', () => {
    expect(text('A')).toBe('Zone A of ISO 20816-3 (group 2, rigid); A/B at 1.4 mm/s r.m.s.');
    expect(text('C')).toBe(
      'Zone C of ISO 20816-3 (group 2, rigid); B/C at 2.8 mm/s r.m.s., C/D at 4.5 mm/s r.m.s.',
    );
    expect(text('D', { machine: { letter: 'D', point: driveV } })).toMatch(
      /; drive end, vertical is in zone D/,
    );
  });

  it('say why there is none', () => {
    expect(text(null, { why: 'the machine stood still' })).toBe(
      'no zone of ISO 20816-3 (group 2, rigid): the machine stood still',
    );
  });

  it('call a change significant up and down, and keep silent of a lesser one', () => {
    const change = {
      by: -0.9e-3,
      reference: 2.4e-3,
      threshold: 0.7e-3,
      significant: true,
      since: 'week',
    } as const;
    expect(text('B', { change })).toMatch(
      /; 0.9 less than a week ago \(2.4\), over 25 % of B\/C \(0.7\): significant, up or down$/,
    );
    expect(text('B', { change: { ...change, significant: false } })).not.toMatch(/significant/);
  });

  it('take the machine from its points of today: a blind one tells nothing', () => {
    const [first] = summaryFacts.points;
    if (first === undefined) throw new Error('no point');
    const at = (letter: ZoneLetter, judging: typeof first.judging, point = driveH) => ({
      ...first,
      judging,
      point,
      bands: first.bands.map((band) => ({ ...band, zone: zoneOf(letter) })),
    });
    expect(machineZoneNow([at('B', 'judged'), at('C', 'judged', driveV), at('D', 'blind')])).toMatchObject({
      letter: 'C',
      point: driveV,
    });
    expect(machineZoneNow([at('D', 'stopped')])).toBeNull();
  });
});

describe('zones in HTML', () => {
  const colours = zoneLetters.map((zone) => {
    const letter = { lead: '', head: '', test: false };
    const blocks = [{ kind: 'pairs', rows: [['Standard', zoneSaid(zoneOf(zone), mmPerS)]] }] as const;
    const found = new RegExp(`<b class="zone" style="[^"]*background:#(\\w{6});color:#(\\w{6})">${zone}</b>`);
    const [, back = '', ink = ''] = found.exec(letterHtml({ ...letter, blocks })) ?? [];
    return { back, ink };
  });
  const rgb = (hex: string) => [0, 2, 4].map((at) => Number.parseInt(hex.slice(at, at + 2), 16) / 255);

  it('carry the letter on one hue, darker from A to D', () => {
    const hues = colours.map(({ back }) => {
      const [r = 0, g = 0, b = 0] = rgb(back);
      const [high, low] = [Math.max(r, g, b), Math.min(r, g, b)];
      expect(high).toBe(b);
      return { hue: 60 * (4 + (r - g) / (high - low)), lightness: (high + low) / 2 };
    });
    for (const { hue } of hues) expect(Math.abs(hue - (hues[0]?.hue ?? 0))).toBeLessThan(8);
    for (let n = 1; n < hues.length; n++)
      expect((hues[n - 1]?.lightness ?? 0) - (hues[n]?.lightness ?? 1)).toBeGreaterThan(0.1);
  });

  it('can be read on each: contrast of at least 4.5 to 1 (WCAG 2.1, 1.4.3)', () => {
    const luminance = (hex: string) => {
      const [r = 0, g = 0, b = 0] = rgb(hex).map((c) =>
        c <= 0.03928 ? c / 12.92 : ((c + 0.055) / 1.055) ** 2.4,
      );
      return 0.2126 * r + 0.7152 * g + 0.0722 * b;
    };
    for (const { back, ink } of colours) {
      const [a, b] = [luminance(back), luminance(ink)];
      expect((Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05)).toBeGreaterThan(4.5);
    }
  });
});
