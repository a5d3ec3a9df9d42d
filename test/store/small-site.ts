import { createHash } from 'node:crypto';
import type { Band, Point, Site } from '../../src/config/site.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { levelOf, limitWith, machineWith, measurementWith, pointWith } from '../detection/site-parts.ts';

/** `id` or `id<former` or `id<former,older`. */
function named(text: string): { readonly id: string; readonly formerly: readonly string[] } {
  const [id = '', formerly] = text.split('<');
  return { id, formerly: formerly === undefined ? [] : formerly.split(',') };
}

/** One limit `<band>-upper` a band; a band written `id<former` has a limit carried over likewise. */
function point(machineId: string, text: string, bands: readonly string[]): Point {
  const like = pointWith({}, { files: null, sidecar: 'none' });
  return {
    ...like,
    machineId,
    ...named(text),
    name: text,
    direction: null,
    mounting: null,
    bands: bands.map((name) => ({ ...(like.bands[0] as Band), ...named(name) })),
    limits: bands.map((name) => {
      const { id, formerly } = named(name);
      return limitWith({
        id: `${id}-upper`,
        formerly: formerly.map((old) => `${old}-upper`),
        bandId: id,
        alert: 0.0028,
        danger: 0.0045,
        onDelay: { recordings: 1 },
      });
    }),
  };
}

/** machine -> point -> bands, each name as `id` or `id<former`. */
export type Tree = Readonly<Record<string, Readonly<Record<string, readonly string[]>>>>;

export function smallSite(tree: Tree): { readonly site: Site; readonly text: string } {
  const text = JSON.stringify(tree);
  const machines = Object.entries(tree).map(([machine, points]) =>
    machineWith({
      ...named(machine),
      name: machine,
      runningSpeedHz: null,
      afterStartMs: 0,
      stoppedExpectedMs: 0,
      criticality: 'B',
      points: Object.entries(points).map(([name, bands]) => point(named(machine).id, name, bands)),
    }),
  );
  return {
    text,
    site: {
      name: 'Larkfen Waterworks',
      timeZone: 'Europe/Dublin',
      file: '/site.yaml',
      configVersion: createHash('sha256').update(text).digest('hex'),
      folders: { drop: '/drop', data: '/data', afterReading: 'archive' },
      machines,
      mail: null,
      summary: null,
      page: null,
      timings: {
        incompleteAfterMs: 600_000,
        unassignedAfterMs: 604_800_000,
        clockToleranceMs: 300_000,
        backlogQuietMs: 60_000,
        backlogWaitMs: 900_000,
        sweepEveryMs: 300_000,
        polling: false,
      },
      largestFileBytes: 2 ** 31,
      shelveAtMostMs: 7 * 86_400_000,
      warnings: [],
    },
  };
}

export function measurementOf(
  machineId: string,
  pointId: string,
  levels: Readonly<Record<string, number>>,
  more: Partial<Measurement> = {},
): Measurement {
  return {
    ...measurementWith(),
    machineId,
    pointId,
    speed: {
      rpm: 2970,
      origin: 'nominal',
      uncertaintyRpm: 60,
      usableForNames: true,
      rangeRpm: null,
      inSpectrum: null,
    },
    levels: Object.entries(levels).map(([bandId, level]) =>
      levelOf(level, { bandId, fingerprint: 'settings-1', exceededBy80Percent: level * 0.95 }),
    ),
    settingsFingerprint: 'all-1',
    ...more,
  };
}
