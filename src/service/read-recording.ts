import {
  type ByteSource,
  isRefusal,
  type QualityFinding,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
  type Sidecar,
} from '../acquisition/recording.ts';
import { SampleQuality } from '../acquisition/sample-quality.ts';
import { appliedSignal, scalingOf } from '../acquisition/scaling.ts';
import type { DemodulationBand } from '../config/envelope-settings.ts';
import type { Part } from '../config/parts.ts';
import { nothingSaid, type SampleLayout, sameLayout } from '../config/sample-layout.ts';
import { type Point, pointPath } from '../config/site.ts';
import { largestSample, Measurer } from '../manipulation/measure.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { runningSpeed } from '../manipulation/running-speed.ts';
import { assessed } from './assess-measurement.ts';

/** A point that takes part in a recording, with what its machine adds. */
export interface PointTask {
  readonly point: Point;
  /** Nominal running speed of its machine; null where the site file has none. */
  readonly nominalHz: number | null;
  /** Of its machine; without it: none. */
  readonly parts?: readonly Part[];
  /** Band of the envelope that its recordings have agreed on; without it: none yet. */
  readonly chosenBand?: DemodulationBand | null;
}

export interface RecordingRead {
  readonly measurements: readonly Measurement[];
  /** Points that got nothing from this file, in words. */
  readonly missing: readonly string[];
  /** Findings on the recording as a whole. */
  readonly quality: readonly QualityFinding[];
  readonly frames: number;
  readonly sampleRateHz: number | null;
}

/**
 * One pass over a recording: samples in blocks of bounded size to the measurer of each point. Bad input is an answer.
 * `onDensity` is shown the density behind each measurement, by its index, in full precision.
 */
export function readRecording(
  source: ByteSource,
  reader: RecordingReader,
  header: RecordingHeader,
  sidecar: Sidecar | null,
  points: readonly PointTask[],
  onDensity: (index: number, density: Float64Array) => void = () => {},
): RecordingRead | Refusal {
  const layout = layoutOf(points);
  const { fed, missing } = measurers(header, sidecar, points, layout);
  const end = feed(reader.samples(source, header, layout), fed);
  if (isRefusal(end)) return end;
  for (const { measurer } of fed) measurer.end(end);
  const sidecarRpm = sidecar?.speedRpm ?? null;
  const quality: QualityFinding[] =
    end.truncated === null ? [] : [{ flag: 'too-short', detail: `the file is cut short: ${end.truncated}` }];
  return {
    measurements: fed.map(({ measurer, task: { nominalHz, parts } }, index) =>
      assessed(
        measurer.finish(runningSpeed({ sidecarRpm, nominalHz }), (density) => onDensity(index, density)),
        parts,
      ),
    ),
    missing,
    quality,
    frames: end.frames,
    sampleRateHz: header.sampleRateHz ?? fed[0]?.rateHz ?? null,
  };
}

/** What the points of a file say of its samples' place: the first one's word, with which the others agree. */
export function layoutOf(points: readonly PointTask[]): SampleLayout {
  return points[0]?.point.recordings.layout ?? nothingSaid;
}

interface Fed {
  readonly task: PointTask;
  readonly index: number;
  readonly measurer: Measurer;
  readonly rateHz: number | null;
}

function measurers(
  header: RecordingHeader,
  sidecar: Sidecar | null,
  points: readonly PointTask[],
  layout: SampleLayout,
): { readonly fed: readonly Fed[]; readonly missing: readonly string[] } {
  const fed: Fed[] = [];
  const missing: string[] = [];
  for (const task of points) {
    const { point } = task;
    if (!sameLayout(point.recordings.layout ?? nothingSaid, layout)) {
      missing.push(`${pointPath(point)}: ${otherLayout(points[0] as PointTask, point)}`);
      continue;
    }
    const index = channelIndex(header, point.channel);
    if (index === null) {
      missing.push(`${pointPath(point)}: ${noSuchChannel(header, point.channel)}`);
      continue;
    }
    const channel = header.channelNames[index] as string;
    const said = sidecar?.channels[channel] ?? sidecar?.channels[String(index + 1)];
    const scaling = scalingOf(header.samples, point.quantity, appliedSignal(point.signal, said));
    if ('reason' in scaling) {
      missing.push(`${pointPath(point)}: ${scaling.reason}`);
      continue;
    }
    const rateHz = header.sampleRateHz ?? point.recordings.sampleRateHz;
    const measurer = new Measurer({
      point,
      channel,
      sampleRateHz: rateHz,
      siPerSample: scaling.siPerSample,
      signal: scaling.signal,
      sidecar,
      chosenBand: task.chosenBand ?? null,
      check: new SampleQuality({
        samples: header.samples,
        sampleRateHz: rateHz,
        quantity: point.quantity,
        voltsPerSample: scaling.voltsPerSample,
        largest: largestSample / scaling.siPerSample,
      }),
    });
    fed.push({ task, index, measurer, rateHz });
  }
  return { fed, missing };
}

function feed(
  blocks: Generator<SampleBlock, SamplesEnd | Refusal>,
  fed: readonly Fed[],
): SamplesEnd | Refusal {
  for (;;) {
    const next = blocks.next();
    if (next.done) return next.value;
    for (const { index, measurer } of fed) measurer.add(next.value.channels[index] as Float64Array);
  }
}

function channelIndex(header: RecordingHeader, channel: number | string): number | null {
  const index = typeof channel === 'number' ? channel - 1 : header.channelNames.indexOf(channel);
  return index >= 0 && index < header.channelNames.length ? index : null;
}

function otherLayout({ point: first }: PointTask, point: Point): string {
  const asks = (one: Point) => one.recordings.layout?.dataset ?? 'no data set of its own';
  return `the file is read as ${pointPath(first)} says (${asks(first)}), this point says otherwise (${asks(point)}); give all points of one file the same dataset, sample_rate_attribute and channels_in: a group holds several channels`;
}

function noSuchChannel(header: RecordingHeader, channel: number | string): string {
  const names = header.channelNames.slice(0, 8).join(', ');
  return typeof channel === 'number'
    ? `the file has ${header.channelNames.length} channels, none number ${channel}`
    : `the file has no column "${channel}"; it has ${names}`;
}
