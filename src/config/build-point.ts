import { tellOfAveraging } from './build-averaging.ts';
import {
  type BuiltBands,
  buildBands,
  type ListLayers,
  tellDoubledBands,
  type WrittenBand,
} from './build-bands.ts';
import { askedEnvelope, type EnvelopeCase, readEnvelope } from './build-envelope.ts';
import { buildLimits, type LimitLayers, tellDoubledLimits } from './build-limits.ts';
import {
  type AnalysisLayers,
  buildAnalysis,
  buildRecordings,
  type RecordingLayers,
  warnOfAnalysis,
} from './build-settings.ts';
import { buildSignal } from './build-signal.ts';
import { type Build, valueOr, valuesOf } from './layers.ts';
import type { MachineZones } from './machine-zones.ts';
import type { pointKeys } from './schema-machines.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { Point, SignalSettings } from './site.ts';
import type { Span } from './site-text.ts';
import type { WrittenSuppressions } from './suppressed-while.ts';

export type WrittenPoint = Written<ReadMap<typeof pointKeys>>;

/** What a point takes over from its machine, the machine's type and the site; outermost first. */
export interface PointSurroundings {
  readonly machineId: string;
  readonly runningSpeedHz: number | null;
  readonly recordings: RecordingLayers;
  readonly analysis: AnalysisLayers;
  readonly bands: ListLayers<WrittenBand>;
  readonly limits: LimitLayers;
  readonly zones: MachineZones | null;
  /** Ids of the machine's operating conditions. */
  readonly conditions: readonly string[];
  /** `suppressed_while` of the machine. */
  readonly suppressedWhile: WrittenSuppressions;
  /** Turns, for one of the machine's speed, of the shafts whose rolling bearings a point hears, by its id. */
  readonly bearingShafts: (pointId: string) => readonly number[];
}

/** A point with the places that later checks of the whole site point at. */
export interface BuiltPoint {
  readonly point: Point;
  readonly idAt: Span;
  /** The id where no channel is written. */
  readonly channelAt: Span;
  readonly bands: BuiltBands;
}

/** One measuring point in SI; null where something without which it means nothing was refused. */
export function buildPoint(
  build: Build,
  written: WrittenPoint,
  around: PointSurroundings,
): BuiltPoint | null {
  const { keys, has } = written.value;
  tellDoubledBands(build, keys.bands);
  tellDoubledLimits(build, keys.limits);
  if (keys.id === null || keys.quantity === null) return null;
  const { runningSpeedHz, machineId } = around;
  const shown = `${machineId}/${keys.id.value}`;
  const at = keys.id.at;
  const quantity = keys.quantity.value;
  const recordingLayers = [...around.recordings, keys.recordings === null ? null : keys.recordings.value];
  const analysisLayers = analysisLayersOf(written, around);
  const recordings = buildRecordings(build, recordingLayers, at, shown);
  const { sampleRateHz, durationS } = recordings;
  const analysis = buildAnalysis(build, analysisLayers, recordings, runningSpeedHz, { at, shown });
  const signal = buildSignal(build, recordingLayers, {
    quantity,
    sensitivity: keys.sensitivity,
    sensitivityRefused: has.has('sensitivity') && keys.sensitivity === null,
    at,
    shown,
  });
  tellOfAveraging(build, analysisLayers, analysis, recordings, shown);
  warnOfAnalysis(build, analysisLayers, analysis, { sampleRateHz, runningSpeedHz, durationS, at, shown });
  const mounting = valueOr(keys.mounting, null);
  const envelopeCase = { quantity, mounting, recordings, analysis, runningSpeedHz, at, shown };
  const { bands, envelope } = bandsAndEnvelope(build, written, around, {
    signal,
    envelopeCase: { ...envelopeCase, bearingShafts: around.bearingShafts(keys.id.value) },
  });
  const sensorOn = valueOr(keys.sensor_on, null);
  const limits = buildLimits(build, [...around.limits, keys.limits], bands, {
    shown,
    conditions: around.conditions,
    suppressedWhile: [keys.suppressed_while, around.suppressedWhile],
    confidencePercent: analysis.confidencePercent,
    zoneCase: { machineId, zones: around.zones, runningSpeedHz, point: { quantity, sensorOn } },
  });
  if (signal === null) return null;
  const point: Point = {
    machineId,
    id: keys.id.value,
    name: valueOr(keys.name, keys.id.value),
    formerly: valuesOf(keys.formerly),
    direction: valueOr(keys.direction, null),
    mounting,
    sensorOn,
    channel: valueOr(keys.channel, 1),
    quantity,
    signal,
    recordings,
    analysis,
    ...(envelope === null ? {} : { envelope }),
    bands: bands.bands.map(({ band }) => band),
    limits,
  };
  return { point, idAt: at, channelAt: keys.channel?.at ?? at, bands };
}

function analysisLayersOf({ value: { keys } }: WrittenPoint, around: PointSurroundings): AnalysisLayers {
  return [...around.analysis, keys.analysis === null ? null : keys.analysis.value];
}

/** The bands of the envelope are judged by how it is made, and they are one of the things that ask for it. */
function bandsAndEnvelope(
  build: Build,
  written: WrittenPoint,
  around: PointSurroundings,
  point: { readonly signal: SignalSettings | null; readonly envelopeCase: EnvelopeCase },
) {
  const { signal, envelopeCase } = point;
  const { quantity, recordings, analysis, runningSpeedHz, mounting, shown } = envelopeCase;
  const layers = analysisLayersOf(written, around);
  const envelope = readEnvelope(build, layers, envelopeCase);
  const { sampleRateHz, sidecar } = recordings;
  const bands = buildBands(build, [...around.bands, written.value.keys.bands], {
    quantity,
    signal,
    sidecar: sidecar === 'expected',
    situation: { analysis, sampleRateHz, runningSpeedHz, mounting, shown, envelope },
  });
  const all = bands.bands.map(({ band }) => band);
  return { bands, envelope: askedEnvelope(build, layers, envelope, all, envelopeCase) };
}
