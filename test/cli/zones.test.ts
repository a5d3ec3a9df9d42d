/** Zones from the site file to what people read, with the real service, ledger and commands. */
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import { alarmMailFacts } from '../../src/service/draft.ts';
import { readersView } from '../../src/service/readers-view.ts';
import { readSiteFile } from '../../src/service/site-in-force.ts';
import { isLedgerRefusal } from '../../src/store/ledger-error.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { openLedger } from '../../src/store/open-ledger.ts';
import { pumpLevels, run, type SmallSite, siteText, smallSite } from './small-site.ts';

/**
 * blower-1, group 2 rigid: de-h 1.5 and nde-h 1.2 mm/s, boundaries 1.4, 2.8, 4.5. pump-2, category I: 2, 2.2, 4, 4.2,
 * 4.4 mm/s, boundaries 2.5, 4, 6.6.
 */
const text = siteText
  .replace(
    '    name: Aeration blower 1\n    type: rotating\n',
    `    name: Aeration blower 1
    type: rotating
    running_speed: 2970 rpm
    zones:
      standard: iso-20816-3
      power: 110 kW
      support: rigid
`,
  )
  .replace(
    '    name: Raw water pump 2\n    type: rotating\n',
    `    name: Raw water pump 2
    type: rotating
    running_speed: 2970 rpm
    zones:
      standard: iso-10816-7
      category: I
      power: 90 kW
    limits: from zones
`,
  );

let site: SmallSite;
beforeAll(async () => {
  site = await smallSite(text);
  for (const [n] of pumpLevels.entries()) await site.hour(n);
}, 60_000);
afterAll(() => site.remove());

const command = (...args: string[]) => run([...args, '--site', site.file], { clock: site.clock });

describe('zones', () => {
  it('decide where the limits stand, and the alarm says why', async () => {
    const journal = JSON.parse((await command('alarms', '--journal', '--json')).out) as {
      readonly event: string;
      readonly about: string;
      readonly reason: Record<string, unknown>;
    }[];
    const raised = journal.filter(({ event }) => event === 'raised');
    expect(raised).toHaveLength(1);
    expect(raised[0]?.reason).toMatchObject({
      alert: 0.004,
      danger: 0.0066,
      why: {
        alert: 'B/C of ISO 10816-7 (category I, up to 200 kW), as there is no baseline',
        danger: 'C/D of ISO 10816-7 (category I, up to 200 kW)',
      },
    });
  });

  it('stand in the alarm mail with their table, their boundaries and the reason of the limit', async () => {
    const siteFile = readSiteFile(site.file);
    const ledger = await openLedger({
      folder: join(site.folder, 'data'),
      mode: 'reader',
      wallMs: () => site.clock.wallMs(),
      monotonicMs: () => 0,
    });
    if ('problems' in siteFile || isLedgerRefusal(ledger)) throw new Error('no site, or no ledger');
    const mail = await ledger.read(async (reader) => {
      const view = await readersView(reader, siteFile.site);
      if (view === null) throw new Error('no view');
      const events = (await untoldEvents(reader, 100)).filter(({ machineId }) => machineId !== null);
      const machineId = events[0]?.machineId ?? null;
      return alarmMail(await alarmMailFacts(reader, view, machineId, events, site.clock.wallMs()));
    });
    await ledger.close();
    const words = mail.text.replace(/\s+/g, ' ');
    expect(words).toContain(
      'Standard Zone C of ISO 10816-7 (category I, up to 200 kW); B/C at 4 mm/s r.m.s., C/D at 6.6 mm/s r.m.s.',
    );
    expect(words).toContain(
      'Limit from alert at B/C of ISO 10816-7 (category I, up to 200 kW), as there is no baseline; danger at C/D of',
    );
    expect(mail.html).toMatch(/Zone <b class="zone" style="[^"]*">C<\/b> of ISO 10816-7/);
  });

  it('stand in check: the table in force, its boundaries, each point, the machine', async () => {
    const { status, out } = await command('check');
    const words = out.replace(/\s+/g, ' ');
    expect(words).toContain(
      'zones ISO 20816-3 (group 2, rigid): velocity A/B 1.4, B/C 2.8, C/D 4.5 mm/s r.m.s.;',
    );
    expect(words).toContain('kept from memory, so compare them with the standard');
    expect(words).toContain('zone now zone B (de-h), the worst of its points');
    expect(words).toContain('zone de-h: overall in zone B');
    expect(words).toContain('zone nde-h: overall in zone A');
    expect(words).toContain('de-v: overall in zone C');
    expect(words).toContain(
      'de-v: overall, alert at B/C of ISO 10816-7 (category I, up to 200 kW), as there is no baseline',
    );
    for (const line of out.split('\n')) expect(Array.from(line).length).toBeLessThanOrEqual(80);
    expect([0, 1]).toContain(status);
    const json = JSON.parse((await command('check', '--json')).out);
    const [blower, pump] = json.machines;
    expect(blower.zones).toMatchObject({ standard: 'iso-20816-3', table: 'ISO 20816-3 (group 2, rigid)' });
    expect(blower.zones.boundaries[0]).toMatchObject({ a_b: 1.4, b_c: 2.8, c_d: 4.5, from_memory: true });
    expect(blower.points[0].bands[0].zone).toEqual({ zone: 'B', why: null, at_least: false });
    expect(pump.points[0].bands[0].limits).toMatchObject([
      { limit: 'overall-zone-upper', kind: 'zone', alert: 4, danger: 6.6 },
    ]);
  });

  it('stand beside each level in trend', async () => {
    const { out } = await command('trend', 'pump-2/de-v', 'overall');
    expect(out).toContain(
      'zones of ISO 10816-7 (category I, up to 200 kW): A/B 2.5, B/C 4, C/D 6.6 mm/s r.m.s.',
    );
    const rows = out.split('\n').filter((line) => line.startsWith('2026-'));
    expect(rows.map((line) => line.trimEnd().split(/ {2,}/).at(-1))).toEqual(
      expect.arrayContaining(['A', 'C']),
    );
    // The pump's 4 mm/s reads 4.005.
    expect(rows.filter((line) => / {2}C$/.test(line))).toHaveLength(3);
    expect((await command('trend', 'blower-1/de-h', 'overall')).out).toMatch(/ {2}B$/m);
  });

  it('stand in the summary: beside the level, and the worst of a machine above its table', async () => {
    const { out } = await command('summary', '--text');
    expect(out).toMatch(
      /^AERATION BLOWER 1 \(CRITICALITY B\), ZONE B OF ISO 20816-3 \(GROUP 2, RIGID\): DRIVE END/m,
    );
    expect(out).toMatch(/drive end vertical, overall +4\.41 mm\/s r\.m\.s\. \([^)]*\), zone C/);
    expect(out).toMatch(/non-drive end horizontal, overall .*, zone A/);
  });
});
