/** The command draft on real folders: the file it writes loads, takes what it was made from, and reads well. */
import { mkdirSync, mkdtempSync, readFileSync, rmSync, utimesSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { dirname, join } from 'node:path';
import fc from 'fast-check';
import { afterEach, describe, expect, it } from 'vitest';
import { siteFiles } from '../../src/acquisition/file-pattern.ts';
import { draftBands } from '../../src/cli/draft/draft-bands.ts';
import { loadSite } from '../../src/config/load.ts';
import { pointPath, type Site } from '../../src/config/site.ts';
import { wavFile } from '../acquisition/wav-writer.ts';
import { run } from './small-site.ts';

const beginMs = Date.UTC(2026, 2, 2, 21);
const hourMs = 3_600_000;
const folders: string[] = [];

afterEach(() => {
  for (const folder of folders.splice(0)) rmSync(folder, { recursive: true });
});

function newFolder(): string {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-draft-'));
  mkdirSync(join(folder, 'drop'));
  folders.push(folder);
  return folder;
}

function drop(folder: string, name: string, bytes: Uint8Array | string, changedMs = beginMs): void {
  const path = join(folder, 'drop', name);
  mkdirSync(dirname(path), { recursive: true });
  writeFileSync(path, bytes);
  utimesSync(path, changedMs / 1000, changedMs / 1000);
}

function wav(channels = 1, rateHz = 5120, seconds = 2, bits: 16 | 32 = 16): Uint8Array {
  const data = new Uint8Array((channels * rateHz * seconds * bits) / 8).fill(1);
  return wavFile({ channels, rateHz, bits, code: bits === 32 ? 3 : 1, data });
}

function csv(heading: string, rateHz = 1000, rows = 2000): string {
  const columns = heading.split('\n')[0]?.split(',').length ?? 1;
  const numbers = (n: number) =>
    Array.from({ length: columns }, (_, column) =>
      column === 0 ? (n / rateHz).toFixed(6) : Math.sin(n + column).toFixed(4),
    );
  return `${heading}\n${Array.from({ length: rows }, (_, n) => numbers(n).join(',')).join('\n')}\n`;
}

async function drafted(
  folder: string,
): Promise<{ readonly site: Site; readonly text: string; readonly out: string }> {
  const { status, out, err } = await run(['draft', 'drop'], { workingFolder: folder });
  expect([status, err]).toEqual([0, '']);
  const path = join(folder, 'site.yaml');
  const text = readFileSync(path, 'utf8');
  const loaded = loadSite(text, path);
  if (!loaded.ok) throw new Error(JSON.stringify(loaded.problems));
  return { site: loaded.site, text, out };
}

const stamp = (hours: number) =>
  `${new Date(beginMs + hours * hourMs).toISOString().slice(0, 19).replace(/[-:]/g, '')}Z`;

describe('draft', () => {
  it('writes what the headers say and marks what it guesses', async () => {
    const folder = newFolder();
    for (const hours of [0, 3, 6, 9]) {
      drop(folder, `blower-1_${stamp(hours)}.wav`, wav(2), beginMs + hours * hourMs + 6000);
      drop(folder, `pump-2_de-v_${stamp(hours)}.wav`, wav(1), beginMs + hours * hourMs + 6000);
    }
    const { site, text, out } = await drafted(folder);
    const points = site.machines.flatMap((machine) => machine.points);
    expect(points.map((point) => [pointPath(point), point.channel])).toEqual([
      ['blower-1/ch1', 1],
      ['blower-1/ch2', 2],
      ['pump-2/de-v', 1],
    ]);
    expect(points[2]).toMatchObject({
      name: 'drive end, vertical',
      direction: 'vertical',
      quantity: 'acceleration',
    });
    expect(points[0]?.recordings).toMatchObject({
      files: '<machine>_<any>.wav',
      startInName: '<year><month><day>T<hour><minute><second>Z',
      clock: { kind: 'utc' },
      sampleRateHz: 5120,
      durationS: 2,
      expectedEveryMs: 3 * hourMs,
    });
    expect(points[0]?.bands.map(({ id, from, to }) => [id, from, to])).toEqual([['overall', 10, 1000]]);
    for (const guess of [
      'sensitivity: 100 mV/g',
      'full_scale: 10 V',
      'expected_every: 3 h',
      '- id: blower-1',
      'quantity: acceleration',
    ])
      expect(text).toMatch(new RegExp(`^ *${guess} +# please confirm`, 'm'));
    expect(text).toMatch(/^ {2}sample_rate: 5\.12 kHz +# as the files say$/m);
    expect(out).toContain(`the ${text.split('# please confirm').length - 1} lines marked`);
  });

  it('stays the same site when every mark is taken away by search and replace', async () => {
    const folder = newFolder();
    for (const hours of [0, 1]) drop(folder, `pump-2_de-v_${stamp(hours)}.wav`, wav(1));
    const { site, text } = await drafted(folder);
    expect(text).toMatch(/# please confirm # /);
    const path = join(folder, 'site.yaml');
    const loaded = loadSite(text.replaceAll('# please confirm', ''), path);
    if (!loaded.ok) throw new Error(JSON.stringify(loaded.problems));
    expect({ ...loaded.site, configVersion: null }).toEqual({ ...site, configVersion: null });
  });

  it('keeps to one key a line, no braces, and lines of 88 characters', async () => {
    const folder = newFolder();
    for (const hours of [0, 1])
      drop(folder, `fan 1/${stamp(hours)}.csv`, csv('time [s],DE H [mm/s],NDE V [mm/s]'));
    const { text } = await drafted(folder);
    for (const line of text.split('\n')) {
      expect(line.length).toBeLessThanOrEqual(88);
      expect(line).not.toMatch(/[{}[\]]/);
      if (!line.trim().startsWith('#')) expect(line).toMatch(/^$|^ *(- )?[a-z_]+(-[0-9]+)?:( |$)/);
    }
  });

  it('takes units and names from the headings of CSV', async () => {
    const folder = newFolder();
    for (const hours of [0, 1, 2]) {
      drop(
        folder,
        `gear_${stamp(hours)}.csv`,
        csv('time [s],DE vertical [mm/s],shaft [um],bias [mV],oil [bar],temp'),
        beginMs + hours * hourMs,
      );
    }
    const { site } = await drafted(folder);
    expect(
      site.machines[0]?.points.map(({ id, channel, quantity, signal }) => [
        id,
        channel,
        quantity,
        signal.samplesIn.text,
      ]),
    ).toEqual([
      ['DE-vertical', 'DE vertical', 'velocity', 'mm/s'],
      ['shaft', 'shaft', 'displacement', 'µm'],
      ['bias', 'bias', 'acceleration', 'mV'],
      ['temp', 'temp', 'acceleration', 'm/s²'],
    ]);
    expect(site.machines[0]?.points[0]).toMatchObject({
      direction: 'vertical',
      recordings: { sampleRateHz: 1000, durationS: 2 },
    });
  });

  it('asks for the sample rate where no file says it', async () => {
    const folder = newFolder();
    drop(
      folder,
      'a_0001.csv',
      Array.from({ length: 300 }, (_, n) => `${Math.sin(n)};${Math.cos(n)}`).join('\n'),
    );
    const { site, text } = await drafted(folder);
    expect(site.machines[0]?.points.map(({ recordings }) => recordings.sampleRateHz)).toEqual([null, null]);
    expect(text).toMatch(/# sample_rate: .*please confirm # the files do not say it/);
  });

  it('is still sound when its hints are taken as they stand', async () => {
    const folder = newFolder();
    for (const hours of [0, 1]) {
      drop(folder, `blower-1_${stamp(hours)}.wav`, wav(2, 25_600, 2));
      drop(folder, `mix_${stamp(hours)}.csv`, csv('time [s],A [m/s2],B [um]'));
    }
    const { text } = await drafted(folder);
    const path = join(folder, 'site.yaml');
    const hinted = text
      .replace(/^( *)# (?=( *)(- )?[a-z_]+:)/gm, '$1')
      .replace(/running_speed: 1480 rpm/g, 'running_speed: 2970 rpm')
      .replace(/^( *power:) /gm, '$1 110 kW ')
      .replace(/^( *support:) /gm, '$1 rigid ');
    const loaded = loadSite(hinted, path);
    if (!loaded.ok) throw new Error(JSON.stringify(loaded.problems));
    expect(loaded.site.mail?.to).toHaveLength(1);
    for (const point of loaded.site.machines.flatMap((machine) => machine.points))
      expect(point.limits.length, pointPath(point)).toBe(point.bands.length);
  });

  it('proposes zones where a band could be judged, and leaves open what only a plate says', async () => {
    const folder = newFolder();
    for (const hours of [0, 1]) {
      drop(folder, `blower-1_${stamp(hours)}.wav`, wav(1, 25_600, 2));
      drop(folder, `pump-2_${stamp(hours)}.wav`, wav(1, 25_600, 2));
      drop(folder, `slow-3_${stamp(hours)}.wav`, wav(1, 320, 20));
    }
    const { text } = await drafted(folder);
    const machines = text.split(/^ {2}- id: /m).slice(1);
    const hintsOf = (id: string) =>
      machines
        .find((one) => one.startsWith(id))
        ?.match(/^ {4}# {1,3}(zones|standard|category|power|support):.*$/gm);
    expect(hintsOf('blower-1')?.map((hint) => hint.replace(/(?<=\S) {2,}# .*/, ''))).toEqual([
      '    # zones:',
      '    #   standard: iso-20816-3',
      '    #   power:',
      '    #   support:',
    ]);
    expect(hintsOf('blower-1')?.[0]).toMatch(/# please confirm/);
    expect(hintsOf('pump-2')?.map((hint) => hint.replace(/(?<=\S) {2,}# .*/, ''))).toEqual([
      '    # zones:',
      '    #   standard: iso-10816-7',
      '    #   category:',
      '    #   power:',
    ]);
    expect(hintsOf('slow-3')).toBeNull();
    const open = text.replace(/^( {4})# (?=zones:| {2}(standard|power|support|category):)/gm, '$1');
    const loaded = loadSite(open, join(folder, 'site.yaml'));
    expect(loaded.ok ? [] : loaded.problems.map(({ what }) => what)).toEqual([
      'power has no value',
      'support has no value',
      'category has no value',
      'power has no value',
    ]);
  });

  it('never overwrites, and says why it cannot write', async () => {
    const folder = newFolder();
    writeFileSync(join(folder, 'site.yaml'), 'mine');
    drop(folder, `a_${stamp(0)}.wav`, wav());
    const second = await run(['draft', 'drop'], { workingFolder: folder });
    expect(second).toMatchObject({ status: 1, out: '' });
    expect(second.err).toMatch(/site\.yaml exists and is not overwritten; name another file by --out/);
    expect(readFileSync(join(folder, 'site.yaml'), 'utf8')).toBe('mine');
    expect((await run(['draft', 'nowhere', '--out', 'b.yaml'], { workingFolder: folder })).err).toMatch(
      /there is no folder/,
    );
    expect((await run(['draft', '.', '--out', 'x/b.yaml'], { workingFolder: folder })).status).toBe(1);
    expect((await run(['draft'], { workingFolder: folder })).status).toBe(2);
  });

  it('says what it left out, and its patterns do not take it', async () => {
    const folder = newFolder();
    for (const hours of [0, 1, 2]) drop(folder, `blower-1_${stamp(hours)}.wav`, wav());
    drop(folder, 'blower-1_notes.txt', 'remarks of the electrician');
    drop(folder, 'blower-1_manual.wav', 'not sound at all');
    const { site, out } = await drafted(folder);
    expect(out).toMatch(/^not taken in: blower-1_notes\.txt: no reader knows/m);
    const files = siteFiles(site);
    expect(files.pointsFor('blower-1_notes.txt')).toEqual([]);
    expect(files.pointsFor('blower-1_manual.wav')).toEqual([]);
    expect(files.pointsFor(`blower-1_${stamp(77)}.wav`)).toHaveLength(1);
  });

  it('expects sidecars where each recording has one', async () => {
    const folder = newFolder();
    for (const hours of [0, 1]) {
      drop(folder, `a_${stamp(hours)}.wav`, wav());
      drop(folder, `a_${stamp(hours)}.json`, '{"speed_rpm": 1480}');
      drop(folder, `b_${stamp(hours)}.wav`, wav());
    }
    const { site } = await drafted(folder);
    expect(site.machines.map(({ points }) => points[0]?.recordings.sidecar)).toEqual([
      'expected',
      'optional',
    ]);
  });

  it('keeps the data folder out of the drop folder', async () => {
    const folder = newFolder();
    drop(folder, `a_${stamp(0)}.wav`, wav());
    const { status } = await run(['draft', '.'], { workingFolder: join(folder, 'drop') });
    expect(status).toBe(0);
    const path = join(folder, 'drop', 'site.yaml');
    const loaded = loadSite(readFileSync(path, 'utf8'), path);
    expect(loaded.ok && loaded.site.folders).toMatchObject({ drop: join(folder, 'drop') });
    expect(loaded.ok && loaded.site.folders.data.startsWith(join(folder, 'drop', ''))).toBe(
      loaded.ok && loaded.site.folders.data === join(folder, 'drop-data'),
    );
  });
});

describe('bands of a draft', () => {
  it('are none that the site file refuses, at any sample rate and length', () => {
    const quantities = [
      'acceleration',
      'velocity',
      'displacement',
      'sound-pressure',
      'current',
      'other',
    ] as const;
    const units = {
      acceleration: 'g',
      velocity: 'mm/s',
      displacement: 'um',
      'sound-pressure': 'Pa',
      current: 'A',
      other: 'bar',
    };
    const rates = fc.oneof(
      fc.double({ min: 1, max: 200, noNaN: true }),
      fc.double({ min: 200, max: 1e6, noNaN: true }),
    );
    fc.assert(
      fc.property(
        fc.constantFrom(...quantities),
        rates,
        fc.integer({ min: 1000, max: 100_000 }),
        (quantity, rate, ms) => {
          const rateHz = Number(rate.toPrecision(4));
          const bands = draftBands(quantity, rateHz, ms / 1000);
          const written = bands.map(
            (band) =>
              `          - id: ${band.id}\n            quantity: ${band.quantity}\n            from: ${band.from}\n            to: ${band.to}\n${band.unit === null ? '' : `            unit: ${band.unit}\n`}`,
          );
          const text = `site: a\ntime_zone: UTC\nfolders:\n  drop: ./drop\n  data: ./data\nrecordings:\n  files: <any>\n  samples_in: ${units[quantity]}\n  sample_rate: ${rateHz} Hz\n  duration: ${ms} ms\n  expected_every: 1 h\nmachines:\n  - id: m\n    points:\n      - id: p\n        quantity: ${quantity}\n${bands.length === 0 ? '' : `        bands:\n${written.join('')}`}`;
          const loaded = loadSite(text, '/site.yaml');
          if (!loaded.ok) throw new Error(`${JSON.stringify(loaded.problems)}\n${text}`);
          if (rateHz > 2000 && quantity !== 'other') expect(bands.length).toBeGreaterThan(0);
        },
      ),
      { seed: 20261201, numRuns: 300 },
    );
  });
});

describe('draft of random folders', () => {
  const series = fc.record({
    machine: fc.oneof(
      fc.constantFrom(
        'pump-1',
        'pump-2',
        'pump-10',
        'fan 3',
        'Gebläse',
        'M1',
        'x<2>',
        'a: b',
        '#7',
        'true',
        '0012',
      ),
      fc.stringMatching(/^[A-Za-z0-9]{1,8}$/),
    ),
    point: fc.constantFrom('', 'de-h', 'nde-v', 'motor', 'bearing2', 'x'),
    mark: fc.constantFrom('_', '-', '/', ' ', '.'),
    time: fc.constantFrom('stamp', 'iso', 'counter', 'plain'),
    ending: fc.constantFrom('.wav', '.csv', '.WAV', '.dat'),
    count: fc.integer({ min: 1, max: 5 }),
    everyHours: fc.constantFrom(0.25, 1, 3, 24),
    channels: fc.integer({ min: 1, max: 3 }),
    rateHz: fc.constantFrom(50, 2048, 12_800),
    readable: fc.integer({ min: 0, max: 6 }).map((n) => n > 0),
  });
  const headings = ['time [s],a [m/s2]', 'time [s],DE H [mm/s],"x, y" [um]', 't,1,2', 'time [s],V [V]'];

  it('loads without errors and takes exactly the files it was made from', async () => {
    await fc.assert(
      fc.asyncProperty(fc.array(series, { minLength: 1, maxLength: 5 }), async (all) => {
        const folder = newFolder();
        const written = new Map<string, boolean>();
        for (const [index, one] of all.entries()) {
          const { machine, point, mark, time, ending, count, everyHours, channels, rateHz, readable } = one;
          const isCsv = ending === '.csv';
          const bytes = !readable
            ? 'rubbish\u0000'
            : isCsv
              ? csv(headings[index % headings.length] as string)
              : wav(channels, rateHz, 1);
          for (let n = 0; n < count; n++) {
            const ms = beginMs + n * everyHours * hourMs;
            const iso = new Date(ms).toISOString();
            const tail = {
              stamp: iso.slice(0, 19).replace(/[-:]/g, ''),
              iso: iso.slice(0, 16).replace(':', '.'),
              counter: String(n + 1).padStart(4, '0'),
              plain: String(n),
            }[time];
            const path = `${[machine, point, tail].filter((word) => word !== '').join(mark)}${ending}`;
            if (written.has(path)) continue;
            drop(folder, path, bytes, ms + 5000);
            written.set(path, readable);
          }
        }
        if (![...written.values()].includes(true)) return;
        const { site } = await drafted(folder);
        const files = siteFiles(site);
        const seen = new Set<string>();
        for (const [path, readable] of written) {
          const taken = files.pointsFor(path).map(pointPath);
          // Names of one structure are one series: its damaged files are taken too, and set aside by the service.
          if (readable) expect([path, taken.length]).not.toEqual([path, 0]);
          for (const point of taken) seen.add(point);
        }
        expect(seen.size).toBe(site.machines.flatMap((machine) => machine.points).length);
      }),
      { seed: 20261201, numRuns: 60 },
    );
  });
});
