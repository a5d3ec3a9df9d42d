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
import type { SpeedSettings } from '../config/speed-settings.ts';
import { largestSample } from '../manipulation/longest-stretch.ts';
import { Measurer } from '../manipulation/measure.ts';
import type { SearchedDensity } from '../manipulation/measure-levels.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import { hasMoved } from '../manipulation/order-levels.ts';
import { assessed } from './assess-measurement.ts';
import { channelIndex, type MachineSpeed, noSuchChannel, RecordingSpeeds } from './recording-speeds.ts';

/** A point that takes part in a recording, with what its machine adds. */
export interface PointTask {
  readonly point: Point;
  /** Nominal running speed of its machine; null where the site file has none. */
  readonly nominalHz: number | null;
  /** How the running speed of its machine is found; without it: as usual. */
  readonly speed?: SpeedSettings;
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
 * One pass over a recording: samples in blocks of bounded size to the measurer of each point, and the pulses of each
 * machine. Where these show that the speed moved, the points of that machine are read once more, over equal angles: only
 * then is it known when its turns began. Bad input is an answer.
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
  const speeds = new RecordingSpeeds(
    header,
    sidecar,
    fed.map(({ task }) => task),
  );
  const feeders = fed.map(({ index, measurer }) => ({ index, to: measurer }));
  const end = feed(reader.samples(source, header, layout), feeders, speeds);
  if (isRefusal(end)) return end;
  const speedOf = speedsOf(fed, speeds, end);
  const angles = fed.map(({ measurer, task }) => {
    const { turning } = speedOf(task);
    return turning !== null && hasMoved(turning) ? measurer.overAngles(turning.turnTimes) : null;
  });
  const turned = fed.flatMap(({ index }, n) => (angles[n] ? [{ index, to: angles[n] }] : []));
  const again = turned.length === 0 ? end : feed(reader.samples(source, header, layout), turned, null);
  if (isRefusal(again)) return again;
  const quality: QualityFinding[] =
    end.truncated === null ? [] : [{ flag: 'too-short', detail: `the file is cut short: ${end.truncated}` }];
  return {
    measurements: fed.map(({ measurer, task }, index) => {
      const onOwn = (density: Float64Array) => onDensity(index, density);
      return assessed(measurer.finish(speedOf(task).answer, onOwn, angles[index] ?? null), task.parts);
    }),
    missing,
    quality,
    frames: end.frames,
    sampleRateHz: header.sampleRateHz ?? fed[0]?.rateHz ?? null,
  };
}

/** Ends the samples; the speed of each machine by the spectra of all its points. */
function speedsOf(
  fed: readonly Fed[],
  speeds: RecordingSpeeds,
  end: SamplesEnd,
): (task: PointTask) => MachineSpeed {
  const spectra = new Map<string, (SearchedDensity | null)[]>();
  for (const { measurer, task } of fed) {
    const { machineId } = task.point;
    spectra.set(machineId, [...(spectra.get(machineId) ?? []), measurer.end(end)]);
  }
  const found = new Map([...spectra].map(([machineId, own]) => [machineId, speeds.of(machineId, own, end)]));
  return ({ point }) => found.get(point.machineId) as MachineSpeed;
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

interface Feeder {
  /** Of the channel in the file. */
  readonly index: number;
  readonly to: { add(samples: Float64Array): void };
}

function feed(
  blocks: Generator<SampleBlock, SamplesEnd | Refusal>,
  feeders: readonly Feeder[],
  speeds: RecordingSpeeds | null,
): SamplesEnd | Refusal {
  for (;;) {
    const next = blocks.next();
    if (next.done) return next.value;
    for (const { index, to } of feeders) to.add(next.value.channels[index] as Float64Array);
    speeds?.add(next.value);
  }
}

function otherLayout({ point: first }: PointTask, point: Point): string {
  const asks = (one: Point) => one.recordings.layout?.dataset ?? 'no data set of its own';
  return `the file is read as ${pointPath(first)} says (${asks(first)}), this point says otherwise (${asks(point)}); give all points of one file the same dataset, sample_rate_attribute and channels_in: a group holds several channels`;
}
