import { copyFileSync, existsSync, mkdirSync, readdirSync, readFileSync, writeFileSync } from 'node:fs';
import { builtinModules } from 'node:module';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it, type TestContext } from 'vitest';
import { machineSignal } from '../../src/cli/demo/machine-signal.ts';
import { seededNoise } from '../../src/cli/demo/noise.ts';
import { wavBytes } from '../../src/cli/demo/write-wav.ts';
import { type Ended, type InstalledPackage, installPackage, run } from './installed-package.ts';
import { olderNode } from './older-node.ts';

/** Set before the tests that use it. */
let installed: InstalledPackage;

/** Runs the installed binary by its name, as a person does. */
function humledger(args: readonly string[], folder = installed.folder): Promise<Ended> {
  return run(join(installed.folder, 'node_modules/.bin/humledger'), args, folder);
}

function needsInstallation(context: TestContext): void {
  context.skip(
    installed.noRegistry !== null,
    `NOT TESTED: no package registry answers (${installed.noRegistry}), so the package's dependencies cannot be installed`,
  );
}

describe('the manifest', () => {
  it('declares every package that its code loads, and no other', () => {
    const { dependencies } = JSON.parse(readFileSync('package.json', 'utf8')) as { dependencies: object };
    const loaded = new Set<string>();
    for (const file of readdirSync('src', { recursive: true, encoding: 'utf8' })) {
      if (!file.endsWith('.ts')) continue;
      const text = readFileSync(join('src', file), 'utf8');
      for (const [, name] of text.matchAll(/(?: from |import\.meta\.resolve\()'([a-z@][^'\s]*)'/gm)) {
        if (name.startsWith('node:') || builtinModules.includes(name)) continue;
        loaded.add(
          name.startsWith('@') ? name.split('/').slice(0, 2).join('/') : (name.split('/')[0] as string),
        );
      }
    }
    expect([...loaded].sort()).toEqual(Object.keys(dependencies).sort());
  });
});

describe('the package, packed and installed into an empty folder', () => {
  beforeAll(async () => {
    installed = await installPackage();
  }, 300_000);

  afterAll(() => installed?.remove());

  it('holds the built program, its configuration and the demo data, and nothing else', () => {
    const paths = installed.files.map(({ path }) => path);
    const strange = paths.filter(
      (path) =>
        !/^(dist\/.*\.js|config\/(zones\/)?[^/]+|demo-data\/.+|package\.json|README\.md|LICENSE)$/.test(path),
    );
    expect(strange).toEqual([]);
    expect(paths.filter((path) => /\.(ts|map)$|\.test\.|(^|\/)test\//.test(path))).toEqual([]);
    for (const needed of [
      'dist/cli/start.js',
      'dist/service/recording-worker.js',
      'config/zones/iso-20816-3.json',
      'dist/store/copy-worker.js',
      'config/site.schema.json',
      'config/site.example.yaml',
      'demo-data/site.yaml',
    ])
      expect(paths).toContain(needed);
  });

  it('shows its commands', async (context) => {
    needsInstallation(context);
    const { status, out, err } = await humledger(['--help']);
    expect([status, err]).toEqual([0, '']);
    for (const command of ['run', 'demo']) expect(out).toMatch(new RegExp(`^ +${command}\\b`, 'm'));
  });

  it('takes a recording, with its worker threads, by run --once', async (context) => {
    needsInstallation(context);
    const folder = makeSite();
    const once = await humledger(['run', '--once', '--site', join(folder, 'site.yaml')]);
    expect(once.err).toBe('');
    expect(once.out).toContain('1 recordings taken, 0 files set aside, 0 left in the drop folder');
    expect(readdirSync(join(folder, 'drop'))).toEqual([]);
    expect(existsSync(join(folder, 'data/ledger.sqlite'))).toBe(true);
  });

  it('finds its zone tables', async (context) => {
    needsInstallation(context);
    const { out } = await humledger(['check', '--site', join(makeSite(), 'site.yaml')]);
    expect(out).toContain('zones     ISO 10816-7 (category II, up to 200 kW): velocity A/B 3.2, B/C 5.1');
  });

  it('analyses a single file', async (context) => {
    needsInstallation(context);
    const folder = makeSite();
    const { status, out, err } = await humledger(
      ['analyse', join(folder, 'drop', recordingName), '--json'],
      folder,
    );
    expect([status, err]).toEqual([0, '']);
    expect(JSON.parse(out)).toMatchObject({
      duration_s: 2,
      sample_rate_hz: 12_800,
      start: '2026-03-02T06:00:00.000Z',
    });
  });

  it('checks and copies a ledger in a thread of its own', async (context) => {
    needsInstallation(context);
    const folder = makeSite();
    await humledger(['run', '--once', '--site', join(folder, 'site.yaml')]);
    const script = join(installed.folder, 'copy.mjs');
    writeFileSync(
      script,
      `import { backupLedger, quickCheck } from 'humledger/dist/store/backup.js';
      const [ledger, copy] = process.argv.slice(2);
      process.stdout.write(JSON.stringify([await quickCheck(ledger), await backupLedger(ledger, copy)]));`,
    );
    const files = [join(folder, 'data/ledger.sqlite'), join(folder, 'copy.sqlite')];
    const { out, err } = await run(process.execPath, [script, ...files], installed.folder);
    expect(err).toBe('');
    expect(JSON.parse(out)).toMatchObject([[], { file: join(folder, 'copy.sqlite') }]);
  });

  it('finds the demo data', async (context) => {
    needsInstallation(context);
    const { status, out, err } = await humledger(['demo', '--days', '1', '--folder', './demo']);
    expect(status, err).toBe(0);
    expect(out).toContain('demo/data/ledger.sqlite');
    // What it suggests to look at lies within the days that were played.
    expect(out).toContain('trend pump-2/de-v overall --since 2026-03-02');
  });

  it('says plainly on an older Node what it needs, and loads nothing else there', async (context) => {
    const older = olderNode();
    context.skip(older === null, 'NOT TESTED: no Node.js older than 22.12 on the path');
    // Alone in a folder: anything that it loaded beside would be missing.
    const alone = join(installed.folder, 'alone');
    mkdirSync(alone);
    const start = join(installed.built, 'cli/start.js');
    copyFileSync(start, join(alone, 'start.mjs'));
    const { path, version } = older as NonNullable<typeof older>;
    for (const file of [start, join(alone, 'start.mjs')]) {
      const { status, out, err } = await run(path, [file, 'run', '--once'], installed.folder);
      expect([status, out]).toEqual([1, '']);
      expect(err).toBe(
        `humledger needs Node.js 22.12 or later; this is ${version}. Install a newer Node.js and start again.\n`,
      );
    }
  });
});

const recordingName = 'pump-1_20260302T060000Z.wav';
let sites = 0;

/** A site of one point with one recording of 2 s in its drop folder. */
function makeSite(): string {
  const folder = join(installed.folder, `site-${++sites}`);
  mkdirSync(join(folder, 'drop'), { recursive: true });
  writeFileSync(join(folder, 'site.yaml'), siteText);
  const signal = machineSignal(
    {
      shaftHz: 24.6,
      harmonicsMmS: [1.2, 0.4],
      mesh: null,
      resonance: { hz: 1900, damping: 0.05 },
      impacts: null,
      noise: { white: 0.2, shaped: 0.5 },
    },
    25_600,
    12_800,
    seededNoise(7),
  );
  writeFileSync(
    join(folder, 'drop', recordingName),
    wavBytes([signal.map((value) => (value * 0.1) / 9.80665 / 5)], 12_800),
  );
  return folder;
}

const siteText = `site: Larkfen Waterworks
time_zone: UTC
folders: { drop: ./drop, data: ./data }
recordings:
  files: <machine>_<any>.wav
  start_in_name: <year><month><day>T<hour><minute><second>Z
  clock: UTC
  sample_rate: 12.8 kHz
  duration: 2 s
  expected_every: 3 h
  settle: 1 s
  samples_in: V
  full_scale: 5 V
machine_types:
  rotating:
    bands:
      - { id: overall, quantity: velocity, from: 10 Hz, to: 1000 Hz, unit: mm/s }
    limits:
      - { band: overall, alert: 2.8 mm/s, danger: 4.5 mm/s }
machines:
  - id: pump-1
    name: Raw water pump 1
    type: rotating
    running_speed: 1480 rpm
    zones: { standard: iso-10816-7, category: II, power: 45 kW }
    limits: from zones
    points:
      - { id: de-h, name: drive end, channel: 1, quantity: acceleration, sensitivity: 100 mV/g }
`;
