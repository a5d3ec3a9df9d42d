import { createHash } from 'node:crypto';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { formatProblems, loadSite, loadSiteFile } from '../../src/config/load.ts';
import { complaints, exampleText, exampleWith, readList, siteOf } from './site-parts.ts';

describe('the site file', () => {
  it('means what its example says', () => {
    const site = siteOf(exampleText);
    expect(site).toMatchObject({
      name: 'Larkfen Waterworks',
      timeZone: 'Europe/Dublin',
      file: '/srv/plant/site.yaml',
      configVersion: createHash('sha256').update(exampleText).digest('hex'),
      folders: { drop: '/srv/plant/drop', data: '/srv/plant/data', afterReading: 'archive' },
      summary: { at: { hour: 6, minute: 30 }, to: [{ address: 'maintenance@larkfen.example' }] },
      page: { host: '127.0.0.1', port: 8470 },
      warnings: [],
    });
    const [blower] = site.machines;
    expect(blower).toMatchObject({
      id: 'blower-1',
      area: 'aeration',
      type: 'blower-small',
      runningSpeedHz: 49.5,
      running: { by: 'speed', aboveRpm: 300 },
      afterStartMs: 600_000,
      criticality: 'A',
      like: ['blower-2'],
      zones: { standard: 'iso-20816-3', powerW: 110_000, support: 'rigid', category: null, class: null },
    });
    const [point] = blower.points;
    expect(point).toMatchObject({
      machineId: 'blower-1',
      name: 'drive end, horizontal',
      mounting: 'stud',
      channel: 1,
      signal: {
        samplesIn: { text: 'V' },
        fullScale: 10,
        sensitivity: 0.1 / 9.80665,
        sensitivityText: '100 mV/g',
      },
      recordings: { sampleRateHz: 25_600, durationS: 10, expectedEveryMs: 3_600_000, ignore: ['<any>.tmp'] },
      analysis: { window: 'hann', overlapPercent: 50, lineSpacingHz: 1.6 },
    });
    expect(point.bands).toMatchObject([
      { id: 'overall', quantity: 'velocity', from: 10, to: 1000, inOrders: false, display: { text: 'mm/s' } },
      { id: 'bearing', quantity: 'acceleration', from: 2000, to: 8000, display: { text: 'm/s²' } },
    ]);
    expect(point.limits).toMatchObject([
      {
        id: 'overall-fixed-upper',
        alert: 0.0028,
        danger: 0.0045,
        onDelay: { recordings: 2 },
        deadbandPercent: 10,
        sayAgainPercent: 25,
        respondWithinMs: 172_800_000,
      },
    ]);
    expect(site.mail).toMatchObject({
      server: { port: 587, security: 'starttls', passwordFile: '/srv/plant/mail-password' },
      secondServer: null,
      gatherMs: 300_000,
      gatherDangerMs: 10_000,
    });
  });

  it('fills what a short file leaves out', () => {
    const site = siteOf(readList('shortest.yaml'));
    expect(site.timings).toEqual({
      incompleteAfterMs: 600_000,
      unassignedAfterMs: 604_800_000,
      clockToleranceMs: 300_000,
      backlogQuietMs: 60_000,
      backlogWaitMs: 900_000,
      sweepEveryMs: 120_000,
      polling: false,
    });
    const [machine] = site.machines;
    expect(machine).toMatchObject({
      name: 'p1',
      criticality: 'B',
      afterStartMs: 0,
      stoppedExpectedMs: 604_800_000,
      running: null,
    });
    const [point] = machine.points;
    expect(point.recordings).toMatchObject({
      expectedEveryMs: 3_600_000,
      overdueAfterMs: 7_200_000,
      settleMs: 5000,
      clock: { kind: 'utc' },
    });
    expect(point.analysis).toMatchObject({
      window: 'hann',
      overlapPercent: 50,
      lineSpacingHz: 1.6,
      confidencePercent: 95,
    });
    expect(point.limits).toMatchObject([
      {
        onDelay: { recordings: 2 },
        offDelay: { recordings: 1 },
        deadbandPercent: 10,
        sayAgainPercent: 25,
        latching: false,
      },
    ]);
    expect(site.summary).toEqual({ at: { hour: 6, minute: 30 }, to: [] });
    expect(site.page).toBeNull();
    expect(site.warnings.map(({ text }) => text)).toEqual([
      'nothing says expected_every of p1/a; 1 h is assumed, so it is overdue after 2 h',
      'without mail: nobody is told of an alarm',
    ]);
  });

  it('lets the point override the machine, the machine its type, and the type the site', () => {
    const text = exampleWith(
      ['  blower-small:\n', '  blower-small:\n    analysis:\n      window: hamming\n      overlap: 66 %\n'],
      [
        '    criticality: A',
        '    analysis:\n      overlap: 60 %\n    recordings:\n      duration: 20 s\n    criticality: A',
      ],
      [
        '      - id: nde-h',
        '      - id: nde-h\n        analysis:\n          line_spacing: 0.8 Hz\n        limits:\n          - band: overall\n            danger: 3 mm/s',
      ],
    );
    const [first, second] = siteOf(text).machines;
    const [deH, ndeH] = first.points;
    expect(deH.analysis).toMatchObject({ window: 'hamming', overlapPercent: 60, lineSpacingHz: 1.6 });
    expect(ndeH.analysis).toMatchObject({ window: 'hamming', overlapPercent: 60, lineSpacingHz: 0.8 });
    expect(second.points[0].analysis).toMatchObject({ window: 'hamming', overlapPercent: 66 });
    expect([deH.recordings.durationS, second.points[0].recordings.durationS]).toEqual([20, 10]);
    expect(deH.limits).toMatchObject([{ alert: 0.0028, danger: 0.0045 }]);
    // The same id, here made of band, kind and side, replaces the whole limit.
    expect(ndeH.limits).toMatchObject([
      { id: 'overall-fixed-upper', alert: null, danger: 0.003, action: null },
    ]);
  });

  it('takes ids as they are written', () => {
    const site = siteOf(
      exampleWith(['- id: de-h', '- id: 0012'], ['- id: nde-h', '- id: 1e3'], ['id: bearing', 'id: 08']),
    );
    expect(site.machines[0].points.map(({ id }) => id)).toEqual(['0012', '1e3']);
    expect(site.machines[0].points[0].bands[1].id).toBe('08');
  });

  it('leaves a shared band out, with a word, where a sensor cannot give it', () => {
    const text = exampleWith(
      ['      - id: bearing\n', '      - id: bearing\n        quantity: acceleration\n'],
      [
        '        quantity: acceleration\n        sensitivity: 100 mV/g\n      - id: nde-h',
        '        quantity: velocity\n        sensitivity: 4 mV/(mm/s)\n      - id: nde-h',
      ],
    );
    const site = siteOf(text);
    expect(site.machines[0].points[0].bands.map(({ id }) => id)).toEqual(['overall']);
    expect(site.warnings.map(({ text: told }) => told)).toEqual([
      "band 'bearing' is left out at blower-1/de-h: acceleration would need velocity to be differentiated; ask for velocity or displacement",
    ]);
  });

  it('uses a longer segment for slow machines unless told otherwise', () => {
    const spacing = (rpm: number) => {
      const text = exampleWith(
        ['  line_spacing: 1.6 Hz\n', ''],
        ['running_speed: 2970 rpm', `running_speed: ${rpm} rpm`],
      );
      return siteOf(text).machines[0].points[0].analysis.lineSpacingHz;
    };
    expect([1200, 1199, 600, 599].map(spacing)).toEqual([1.6, 0.8, 0.8, 0.4]);
  });

  it('carries earlier ids, delays in time, other recipients', () => {
    const text = exampleWith(
      ['    name: Aeration blower 1', '    name: Aeration blower 1\n    formerly: [old-1, 007]'],
      ['on_delay: 2 recordings', 'on_delay: 90 min\n        off_delay: 3 recordings\n        latching: true'],
      ['say_again_at: +25 %', 'say_again_at: never'],
      [
        '    - address: maintenance@larkfen.example\n',
        '    - address: a@larkfen.example\n      areas: [aeration]\n      severities: [danger, trouble]\n',
      ],
    );
    const site = siteOf(text);
    expect(site.machines[0].formerly).toEqual(['old-1', '007']);
    expect(site.machines[0].points[0].limits[0]).toMatchObject({
      onDelay: { ms: 5_400_000 },
      offDelay: { recordings: 3 },
      latching: true,
      sayAgainPercent: null,
    });
    expect(site.mail?.to).toEqual([
      {
        address: 'a@larkfen.example',
        machines: null,
        areas: ['aeration'],
        severities: ['danger', 'trouble'],
      },
    ]);
  });

  it('has a running level that two points share, in the r.m.s. of its band', () => {
    const text = exampleWith(['running: speed above 300 rpm', 'running: level of overall above 0.5 mm/s']);
    expect(siteOf(text).machines[0].running).toEqual({ by: 'level', bandId: 'overall', above: 0.0005 });
  });

  it('trends a quantity of its own in the unit of its samples', () => {
    const text = readList('shortest.yaml')
      .replace('samples_in: g', 'samples_in: kg/h')
      .replace('quantity: velocity', 'quantity: other')
      .replace('quantity: acceleration', 'quantity: other')
      .replace('4.5 mm/s', '80 kg/h');
    const [point] = siteOf(text).machines[0].points;
    expect(point.bands[0].display).toEqual({ text: 'kg/h', quantity: 'other', inSi: 1, detector: 'rms' });
    expect(point.limits[0].alert).toBe(80);
    expect(complaints(text.replace('80 kg/h', '80 kg'))[0]).toContain('write: alert: 80 kg/h');
  });

  it('is frozen all the way down', () => {
    const open: string[] = [];
    const walk = (value: unknown, path: string) => {
      if (typeof value !== 'object' || value === null) return;
      if (!Object.isFrozen(value)) open.push(path);
      for (const [name, part] of Object.entries(value)) walk(part, `${path}.${name}`);
    };
    walk(siteOf(exampleText), 'site');
    expect(open).toEqual([]);
  });

  it('gives every problem of a missing or unreadable file one line', () => {
    const folder = mkdtempSync(join(tmpdir(), 'site-'));
    const file = join(folder, 'site.yaml');
    const missing = loadSiteFile(file);
    expect(missing.ok ? [] : formatProblems(file, missing.problems)).toEqual([
      `${file}:1:1: there is no such file; name the site file by --site FILE, or let draft write one`,
    ]);
    writeFileSync(file, exampleText);
    expect(loadSiteFile(file)).toMatchObject({
      ok: true,
      site: { file, folders: { drop: join(folder, 'drop') } },
    });
    rmSync(folder, { recursive: true });
    expect(complaints('')).toEqual([
      'site.yaml:1:1: the site file is empty; begin with: site: NAME, or let draft write one',
    ]);
  });
});

describe('a site file that means harm', () => {
  /** As much as the bounds on lines and their length let through. */
  const lines = (piece: string, before = '') =>
    Array.from({ length: 25 }, () => before + piece.repeat(Math.floor(3900 / piece.length))).join('\n');

  it('is refused above 1 MB', () => {
    expect(complaints(`${exampleText}#${'x\n#'.repeat(524_288)}`)).toEqual([
      'site.yaml:1:1: the site file is larger than 1 MB; share bands and limits by machine_types',
    ]);
  });

  it.each([
    ['nested brackets', lines('[')],
    ['nested lists', lines('- ')],
    ['brackets on lines of their own', '[\n'.repeat(20_000)],
    ['one key after another', Array.from({ length: 9000 }, (_, n) => `k${n}: 1`).join('\n')],
    ['one brace full of words', `site: {\n${lines('k, ')}}`],
    ['aliases', `machines: &a [x]\nlike: [\n${lines('*a, ')}]`],
    ['bad escapes', `site:\n${lines('\\d', ' - "')}`],
    ['colons', lines('a: ')],
    ['tabs', '\tx: "\\d"\n'.repeat(4000)],
    ['one long line', '['.repeat(1_000_000)],
    ['more lines than any site', 'a:\n'.repeat(60_000)],
  ])('ends in bounded work: %s', (_, text) => {
    const answer = loadSite(text, '/srv/plant/site.yaml');
    expect(answer.ok).toBe(false);
    if (!answer.ok) expect(answer.problems.length).toBeLessThanOrEqual(201);
  });

  it('cannot unroll aliases without bound', () => {
    const lists = Array.from({ length: 9 }, (_, n) => `${n}: &l${n} [${`*l${n - 1}, `.repeat(9)}]`).slice(1);
    const bomb = `site: x\nmachine_types:\n  t: {bands: &l0 [{id: a, from: 1 Hz, to: 2 Hz}]}\nmachines:\n${lists.map((line) => `  ${line}`).join('\n')}\n`;
    expect(loadSite(bomb, '/srv/plant/site.yaml').ok).toBe(false);
  });

  it('cannot reach the prototype of an object', () => {
    const answer = loadSite(
      `${exampleText}__proto__:\n  polluted: yes\nconstructor: x\n`,
      '/srv/plant/site.yaml',
    );
    expect(answer.ok).toBe(false);
    expect(({} as Record<string, unknown>).polluted).toBeUndefined();
    expect(
      siteOf(
        exampleWith(
          ['  blower-small:', '  constructor:'],
          ['type: blower-small', 'type: constructor'],
          ['type: blower-small', 'type: constructor'],
        ),
      ).machines,
    ).toHaveLength(2);
  });

  it('cannot hide a control character in a name', () => {
    expect(complaints(exampleWith(['Aeration blower 1', 'Aeration\u0007']))[0]).toBe(
      'site.yaml:57:19: a control character (0x07) stands here; remove it, or save the file as UTF-8 text',
    );
    expect(complaints(exampleWith(['name: Aeration blower 1', 'name: "a\\r\\nBcc: x"']))).toEqual([
      "site.yaml:57:11: name: the text holds a line break or control character; write: name: 'a Bcc: x'",
    ]);
    const action = siteOf(
      exampleWith([
        'action: Check base',
        'action: |\n          One\n          Two\n        id: x\n        #',
      ]),
    );
    expect(action.machines[0].points[0].limits[0].action).toBe('One\nTwo');
  });
});
