import type { Limit, Machine, Site } from '../../src/config/site.ts';
import type { BandLevel, Measurement } from '../../src/manipulation/measurement.ts';
import { evaluate } from '../../src/service/evaluate.ts';
import { learn } from '../../src/service/learn.ts';
import { addNote } from '../../src/service/machine-acts.ts';
import { rehearseSite, type SiteRehearsal } from '../../src/service/rehearse.ts';
import { type SiteView, siteView } from '../../src/service/site-view.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import { insertRecording } from '../../src/store/recordings.ts';
import { saveAlarmChange } from '../../src/store/save-alarm.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { noteArrival } from '../../src/store/sources.ts';
import { insertMeasurement } from '../../src/store/trends.ts';
import { levelOf, limitWith } from '../detection/site-parts.ts';
import { recordingOf } from '../store/new-recording.ts';
import { measurementOf, smallSite } from '../store/small-site.ts';
import { opened, temporaryFolder } from '../store/temporary-ledger.ts';

/**
 * A pump of one point with a band each for the limits that are tried, whose recordings are decided as the service decides
 * them: judged, stored, learned from, in one transaction each. Eight recordings a day. Levels in m/s.
 */
export const hourMs = 3_600_000;
export const everyMs = 3 * hourMs;
export const beginMs = Date.UTC(2026, 9, 1, 1);

export interface Heard {
  /** By band. */
  readonly levels: Readonly<Record<string, Partial<BandLevel> & { readonly level: number }>>;
  readonly more?: Partial<Measurement>;
  readonly late?: boolean;
}

export function plantSite(limits: readonly Partial<Limit>[], machine: Partial<Machine> = {}): Site {
  const bands = [...new Set(limits.map(({ bandId = 'overall' }) => bandId))];
  const { site } = smallSite({ pump: { de: bands } });
  return {
    ...site,
    machines: site.machines.map((one) => ({
      ...one,
      ...machine,
      points: one.points.map((point) => ({
        ...point,
        recordings: { ...point.recordings, expectedEveryMs: everyMs },
        limits: limits.map((limit, n) =>
          limitWith({ id: `limit-${n}`, alert: 0.0028, danger: null, ...limit }),
        ),
      })),
    })),
    mail: {
      from: 'humledger@larkfen.example',
      server: { host: '127.0.0.1', port: 1, security: 'none', user: null, passwordFile: null },
      secondServer: null,
      gatherMs: 0,
      gatherDangerMs: 0,
      catchUpAfterMs: 0,
      to: [
        { address: 'ann@larkfen.example', machines: null, areas: null, severities: null },
        { address: 'ben@larkfen.example', machines: null, areas: null, severities: ['danger'] },
      ],
    },
  };
}

export class Plant {
  readonly ledger: Ledger;
  readonly view: SiteView;
  #count = 0;

  static async begin(site: Site): Promise<Plant> {
    const ledger = await opened(temporaryFolder(), { wait: async () => {} });
    const view = await ledger.transact(async (writer) => {
      const { ids } = await syncSite(writer, site, { text: 'a text that is no site file', wallMs: beginMs });
      return siteView(site, ids);
    });
    return new Plant(ledger, view);
  }

  constructor(ledger: Ledger, view: SiteView) {
    this.ledger = ledger;
    this.view = view;
  }

  async hear(usedMs: number, { levels, more = {}, late = false }: Heard): Promise<void> {
    const { view } = this;
    const n = ++this.#count;
    const measurement = measurementOf(
      'pump',
      'de',
      {},
      {
        ...more,
        levels: Object.entries(levels).map(([bandId, one]) =>
          levelOf(one.level, { bandId, fingerprint: `settings of ${bandId}`, ...one }),
        ),
      },
    );
    await this.ledger.transact(async (writer) => {
      const recordingId = await insertRecording(
        writer,
        recordingOf({
          identity: `identity-${n}`,
          contentSha256: `content-${n}`,
          configVersionId: view.ids.configVersionId,
          arrivedMs: usedMs,
          statedMs: usedMs,
          usedMs,
          evaluated: !late,
        }),
      );
      const input = { view, measurements: [measurement], usedMs, late, judged: true, recordingFlags: [] };
      const context = {
        ids: view.ids,
        wallMs: usedMs,
        recordingId,
        actor: 'service',
        via: 'service',
        fromBacklog: false,
      } as const;
      for (const one of await evaluate(writer, input)) {
        await insertMeasurement(writer, view.ids, {
          ...one,
          recordingId,
          usedMs,
          evaluated: !late,
          atAlarm: false,
        });
        for (const change of one.changes) await saveAlarmChange(writer, change, context);
        await learn(writer, view, one.point, usedMs);
      }
      await noteArrival(writer, view.ids.pointId('pump', 'de'), {
        arrivedMs: usedMs,
        usedMs,
        evaluated: !late,
      });
    });
  }

  async repair(atMs: number): Promise<void> {
    const place = { machine: this.view.machine('pump'), point: null };
    const note = { kind: 'repair', atMs, found: null, comment: null } as const;
    await addNote(this.ledger, place, note, { by: 'K. Example', via: 'command', wallMs: atMs });
  }

  async rehearsed(
    site: Site = this.view.site,
    more: Partial<Parameters<typeof rehearseSite>[1]> = {},
  ): Promise<SiteRehearsal> {
    const rehearsal = await rehearseSite(this.ledger, {
      site,
      fromMs: beginMs,
      toMs: Number.MAX_SAFE_INTEGER,
      machineId: null,
      wanted: null,
      progress: () => {},
      ...more,
    });
    if (rehearsal === null) throw new Error('no levels');
    return rehearsal;
  }
}
