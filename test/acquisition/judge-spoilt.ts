import { readHead } from '../../src/acquisition/byte-source.ts';
import { readerFor } from '../../src/acquisition/readers.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type Sidecar,
} from '../../src/acquisition/recording.ts';
import type { SampleLayout } from '../../src/config/sample-layout.ts';
import { type PointTask, type RecordingRead, readRecording } from '../../src/service/read-recording.ts';
import { testBand, testPoint } from '../manipulation/point.ts';
import type { Spoilt } from './spoilt-recordings.ts';

/**
 * Reads a recording as a worker of the service does: the reader by its first bytes, the header, then all samples to the
 * measurer of each point. Whatever the bytes are, that ends, in bounded reads, with numbers that the ledger can keep or
 * with one line of reason. Throws where a promise is broken.
 */
export type Answer = 'measured' | 'nothing measured' | 'foreign' | 'damaged' | 'unsupported';

const signal = (fullScale: number) => ({
  samplesIn: { text: 'm/s2', quantity: 'acceleration', inSi: 1 } as const,
  fullScale,
  sensitivity: null,
  sensitivityText: null,
});

/** Two points on one channel, of short and of long segments, and one on a second channel by its heading. */
const points: readonly PointTask[] = [
  testPoint({ signal: signal(50) }, { lineSpacingHz: 20 }),
  testPoint(
    { id: 'nde-h', signal: signal(50), bands: [testBand('order-1', 'velocity', 0.7, 1.3, true)] },
    { segmentSamples: 64, overlapPercent: 75 },
  ),
  testPoint({ id: 'de-v', channel: 'A', signal: signal(1) }, { lineSpacingHz: 1.6, skipStartS: 0.01 }),
].map((point) => ({ point, nominalHz: 25 }));

/** The same points of a site file that says where the samples stand; files without a rate get one from it. */
function pointsWith(layout: SampleLayout): readonly PointTask[] {
  return points.map((task) => {
    const { recordings } = task.point;
    return { ...task, point: { ...task.point, recordings: { ...recordings, sampleRateHz: 2560, layout } } };
  });
}

const oneLine = /^[^\n\r\0]{5,400}$/;
const mostReads = 6000;
/** Of what is all the same, by deflate. */
const mostCompression = 1100;

/** `broken` keeps what was wrong with a read, for a reader's library may swallow what is thrown at it. */
interface Watched extends ByteSource {
  broken: string | null;
}

function watched(bytes: Uint8Array): Watched {
  let reads = 0;
  const source: Watched = {
    size: bytes.length,
    broken: null,
    read(offset, into) {
      if (++reads > mostReads) source.broken = `more than ${mostReads} reads of ${bytes.length} bytes`;
      if (!Number.isSafeInteger(offset) || offset < 0) source.broken = `read at ${offset}`;
      if (source.broken !== null) throw new Error(source.broken);
      const found = bytes.subarray(offset, offset + into.length);
      into.set(found);
      return found.length;
    },
  };
  return source;
}

export async function judge(spoilt: Spoilt, sidecar: Sidecar | null = null): Promise<Answer> {
  const source = watched(spoilt.bytes);
  const answer = await answerTo(spoilt, source, sidecar);
  if (source.broken !== null) throw new Error(source.broken);
  return answer;
}

async function answerTo(
  { fileName, bytes, layout }: Spoilt,
  source: ByteSource,
  sidecar: Sidecar | null,
): Promise<Answer> {
  const reader = readerFor(readHead(source), fileName);
  if (isRefusal(reader)) return refusal(reader);
  await reader.prepare?.();
  const header = reader.header(source, layout);
  if (isRefusal(header)) return refusal(header);
  checkHeader(header);
  const tasks = layout === undefined ? points : pointsWith(layout);
  const read = readRecording(source, reader, header, sidecar, tasks);
  if (isRefusal(read)) return refusal(read);
  checkRead(read, bytes.length * (reader.format === 'HDF5' ? mostCompression : 1));
  return read.measurements.some(({ waveform }) => waveform !== null) ? 'measured' : 'nothing measured';
}

function refusal({
  refused,
  reason,
}: {
  refused: 'foreign' | 'damaged' | 'unsupported';
  reason: string;
}): Answer {
  if (!oneLine.test(reason)) throw new Error(`not one plain line: ${JSON.stringify(reason)}`);
  return refused;
}

function checkHeader(header: RecordingHeader): void {
  const rate = header.sampleRateHz;
  if (rate !== null && !(rate > 0 && Number.isFinite(rate))) throw new Error(`a rate of ${rate} Hz`);
  if (header.channelNames.length > 1024) throw new Error(`${header.channelNames.length} channels`);
  if (header.start !== null && !Number.isFinite(header.start.ms))
    throw new Error(`a start at ${header.start.ms}`);
  finite(header, 'header');
}

function checkRead(read: RecordingRead, size: number): void {
  if (!(read.frames >= 0 && read.frames <= size)) throw new Error(`${read.frames} frames of ${size} bytes`);
  for (const { detail } of [...read.quality, ...read.measurements.flatMap(({ quality }) => quality)])
    if (!oneLine.test(detail)) throw new Error(`not one plain line: ${JSON.stringify(detail)}`);
  finite(read, 'read');
  for (const { levels, peaks } of read.measurements) {
    for (const { level, intervalLow, intervalHigh, bandId } of levels)
      if (!(level >= 0 && intervalLow <= level && level <= intervalHigh))
        throw new Error(`level of ${bandId}: ${intervalLow} ${level} ${intervalHigh}`);
    for (const { level, frequencyHz } of peaks)
      if (!(level > 0 && frequencyHz >= 0)) throw new Error(`a peak of ${level} at ${frequencyHz} Hz`);
  }
}

/** The ledger stores no number that is none. */
function finite(value: unknown, path: string): void {
  if (typeof value === 'number') {
    if (!Number.isFinite(value)) throw new Error(`${path} is ${value}`);
  } else if (ArrayBuffer.isView(value)) {
    for (const [index, part] of (value as Float64Array).entries()) finite(part, `${path}[${index}]`);
  } else if (typeof value === 'object' && value !== null) {
    for (const [name, part] of Object.entries(value)) finite(part, `${path}.${name}`);
  }
}
