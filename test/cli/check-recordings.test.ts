/** What check says of the recordings themselves: what they can and cannot show, and nothing of what stands still. */
import { mkdirSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, it } from 'vitest';
import { beginMs, run, type SmallSite, sines, siteText, smallSite } from './small-site.ts';

const folders: string[] = [];

afterAll(() => {
  for (const folder of folders) rmSync(folder, { recursive: true });
});

/** A site without recordings. */
function siteOf(text: string): string {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-advice-'));
  folders.push(folder);
  mkdirSync(join(folder, 'drop'));
  writeFileSync(join(folder, 'site.yaml'), text);
  return join(folder, 'site.yaml');
}

const words = (text: string) => text.replace(/\s+/g, ' ');

const bearing = `    running_speed: 1480 rpm
    parts:
      - id: de-bearing
        kind: rolling-bearing
        at: [de-v]
        shaft: 1x
        bpfo: 3.585x
`;

interface Advised {
  readonly shows: { readonly least_named_rpm: number; readonly line: { readonly high_db: number } } | null;
  readonly cannot_show: readonly {
    readonly rule: string;
    readonly band: string | null;
    readonly text: string;
    readonly remedy: string;
    readonly line_spacing_hz: number | null;
    readonly duration_s: number | null;
  }[];
}

async function advised(path: string): Promise<Map<string, Advised>> {
  const { out, err } = await run(['check', '--site', path, '--json']);
  expect(err).toBe('');
  const { machines } = JSON.parse(out) as {
    machines: { machine: string; points: (Advised & { point: string })[] }[];
  };
  return new Map(
    machines.flatMap(({ machine, points }) => points.map((one) => [`${machine}/${one.point}`, one])),
  );
}

describe('what recordings show', () => {
  it('is one line for a site whose points are recorded alike', async () => {
    const { out } = await run(['check', '--site', siteOf(siteText)]);
    expect(out.match(/^Shows/gm)).toHaveLength(1);
    expect(out).not.toContain('cannot show');
    // 2 s at 2.56 kHz in segments of 1024: lines 2.5 Hz apart, hann.
    expect(words(out)).toContain('two tones from 7.5 Hz apart on (8.75 Hz where one is 20 dB weaker)');
    expect(words(out)).toContain('faults named in the spectrum of shafts from 3750 rpm on');
  });

  it('names what they cannot, with settings that would do, and these do', async () => {
    const text = siteText.replace('    name: Raw water pump 2\n', `    name: Raw water pump 2\n${bearing}`);
    const pump = (await advised(siteOf(text))).get('pump-2/de-v');
    const [names] = pump?.cannot_show ?? [];
    expect(names).toMatchObject({ rule: 'names', line_spacing_hz: 0.98, duration_s: 5 });
    const { out } = await run(['check', '--site', siteOf(text)]);
    expect(words(out)).toContain('pump-2/de-v: the spectrum names no fault at 1480 rpm');
    expect(words(out)).toContain('line_spacing: 0.98 Hz and duration: 5 s would do');
    // Only the point that hears the bearing is spoken of.
    expect(out).not.toMatch(/blower-1\/de-h: no peak/);
    const mended = text
      .replace('line_spacing: 2.5 Hz', 'line_spacing: 0.98 Hz')
      .replace('duration: 2 s', 'duration: 5 s');
    expect((await advised(siteOf(mended))).get('pump-2/de-v')?.cannot_show).toEqual([]);
  });

  it('counts the slowest shaft that a point hears', async () => {
    const text = siteText
      .replace('    name: Raw water pump 2\n', `    name: Raw water pump 2\n${bearing}`)
      .replace('shaft: 1x', 'shaft: 0.25x');
    const [names] = (await advised(siteOf(text))).get('pump-2/de-v')?.cannot_show ?? [];
    expect(names?.text).toContain('at 370 rpm');
  });

  it('says where a level of noise wanders by more than a significant change, and the length that ends it', async () => {
    const narrow = siteText.replace(
      '        unit: mm/s\n',
      '        unit: mm/s\n      - id: narrow\n        from: 100 Hz\n        to: 108 Hz\n',
    );
    const pump = (await advised(siteOf(narrow))).get('pump-2/de-v');
    const [band] = pump?.cannot_show ?? [];
    expect(band).toMatchObject({ rule: 'band-level', band: 'narrow' });
    const longer = narrow.replace('duration: 2 s', `duration: ${band?.duration_s} s`);
    expect((await advised(siteOf(longer))).get('pump-2/de-v')?.cannot_show).toEqual([]);
  });

  it('says where a recording holds too few averages, or more than is used', async () => {
    const short = siteText.replace('duration: 2 s', 'duration: 0.5 s');
    const rules = (path: string) =>
      advised(path).then((all) => all.get('pump-2/de-v')?.cannot_show.map(({ rule }) => rule));
    expect(await rules(siteOf(short))).toContain('few-averages');
    const wasted = siteText
      .replace('duration: 2 s', 'duration: 0.59 s')
      .replace('window: hann', 'window: hann');
    expect(await rules(siteOf(wasted))).toContain('unused');
  });

  it('advises neither longer recordings where they are pooled, nor on bands of the envelope', async () => {
    const pooled = siteText
      .replace('duration: 2 s', 'duration: 0.5 s')
      .replace('  line_spacing: 2.5 Hz', '  line_spacing: 2.5 Hz\n  average_over: 30 recordings');
    expect((await advised(siteOf(pooled))).get('pump-2/de-v')?.cannot_show).toEqual([]);
    const envelope = siteText.replace(
      '        unit: mm/s\n',
      '        unit: mm/s\n      - id: shocks\n        of: envelope\n        from: 20 Hz\n        to: 28 Hz\n',
    );
    expect((await advised(siteOf(envelope))).get('pump-2/de-v')?.cannot_show).toEqual([]);
  });

  it('stays readable for 200 points: what is alike is said once, for the most demanding', async () => {
    const machines = Array.from(
      { length: 100 },
      (_, n) => `  - id: fan-${n}
    type: rotating
    running_speed: ${1000 + n} rpm
    parts:
      - id: wheel
        kind: blades
        at: [de, nde]
        count: 9
    points:
      - id: de
        channel: 1
        quantity: acceleration
      - id: nde
        channel: 2
        quantity: acceleration
`,
    );
    const path = siteOf(siteText.replace(/machines:\n[\s\S]*$/, `machines:\n${machines.join('')}`));
    const begun = performance.now();
    const { out, err } = await run(['check', '--site', path]);
    expect(err).toBe('');
    expect(performance.now() - begun).toBeLessThan(20_000);
    const section = out.slice(out.indexOf('What recordings cannot show'), out.indexOf('Averaging'));
    expect(section.trimEnd().split('\n').length).toBeLessThanOrEqual(6);
    expect(words(section)).toContain(
      'fan-0/de, fan-0/nde and 198 more: the spectrum names no fault at 1000 rpm',
    );
    expect(out.match(/^Shows/gm)).toHaveLength(1);
  }, 60_000);
});

describe('a machine that stands still', () => {
  const text = siteText
    .replace('from: 10 Hz', 'from: 20 Hz')
    .replace(
      '    name: Raw water pump 2\n',
      '    name: Raw water pump 2\n    running: speed above 300 rpm\n',
    );
  /** Drops a recording of the pump at the speed. */
  function drop(site: SmallSite, stamp: string, rpm: number, wav: Uint8Array): void {
    const at = (name: string) => join(site.folder, 'drop', name);
    writeFileSync(at(`pump-2_${stamp}.json`), JSON.stringify({ speed_rpm: rpm }));
    writeFileSync(at(`pump-2_${stamp}.wav`), wav);
  }
  /** Velocity that rises steadily towards 0 Hz: a random walk of acceleration. */
  function slope(): Uint8Array {
    const wav = sines([0], 1).slice();
    const view = new DataView(wav.buffer);
    const first = wav.length - 4 * 5120;
    let walk = 0;
    let seed = 20261201;
    for (let n = 0; n < 5120; n++) {
      seed = (Math.imul(seed, 1664525) + 1013904223) >>> 0;
      walk = 0.999 * walk + 0.01 * (seed / 2 ** 32 - 0.5);
      view.setFloat32(first + 4 * n, walk, true);
    }
    return wav;
  }

  it('is not judged, neither from a file on the spot nor from the ledger', async () => {
    const site = await smallSite(text);
    try {
      const check = async () => (await run(['check', '--site', site.file], { clock: site.clock })).out;
      drop(site, '20260302T060000Z', 1480, sines([4], 1));
      const running = await check();
      expect(running).toMatch(/overall +4\.0\d mm\/s .* 14\d % of 2\.8 !/);
      drop(site, '20260302T070000Z', 1480, slope());
      expect(await check()).toContain('ski-slope');
      drop(site, '20260302T070000Z', 0, slope());
      const file = await check();
      expect(file).toMatch(/levels +de-v: the machine stood still: not judged/);
      expect(file).not.toContain('ski-slope');
      expect(file.slice(file.indexOf('pump-2:'))).not.toMatch(/% of 2\.8/);

      site.clock.advance(beginMs + 3_610_000 - site.clock.wallMs());
      await site.rounds(0, 6_000, 12_000);
      const ledger = await check();
      expect(ledger).toMatch(/de-v +0 +2 +2 +2026-03-02 07:00\n/);
      expect(ledger).toMatch(/not-running/);
      expect(ledger).not.toContain('ski-slope');
      expect(ledger.slice(ledger.indexOf('pump-2:'))).not.toMatch(/% of 2\.8/);
      const { machines } = JSON.parse(
        (await run(['check', '--site', site.file, '--json'], { clock: site.clock })).out,
      ) as {
        machines: { points: { bands: { level: object; limits: { share_of_alert: number | null }[] }[] }[] }[];
      };
      const [band] = machines[1]?.points[0]?.bands ?? [];
      expect(band?.level).not.toBeNull();
      expect(band?.limits[0]?.share_of_alert).toBeNull();
    } finally {
      await site.remove();
    }
  }, 60_000);
});
