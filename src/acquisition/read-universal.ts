import { distinctNames } from './csv-heading.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
  type StatedStart,
} from './recording.ts';
import { universalValues, valuesTogether } from './universal-values.ts';
import { type PlacedResponse, type UniversalFile, walkUniversal } from './universal-walk.ts';

/** Samples of all channels in one block: 1 MiB of numbers. */
const samplesPerBlock = 131_072;
/** Of the file, shared by the data sets that are read side by side. */
const bufferBytes = 2_097_152;

/**
 * Universal files: the time responses of data sets 58 and 58b (University of Cincinnati SDRL), each a channel; real
 * values, single or double, evenly spaced. Names come from response entity, node and direction, or the first line;
 * units are shown, what counts is the site file's `samples_in`. Memory is one block, its buffers, and a line's worth a
 * data set. Reports: damaged (data set and record named), unsupported (complex or uneven values, no time response,
 * lengths or rates that differ), truncated (frames that all channels have are given).
 */
export const universalReader: RecordingReader = { format: 'UFF 58', recognise, header, samples };

const firstLines = /^(?: *\r?\n)* {4}-1 *\r?\n( {0,5}\d{1,6})(b?)([^\n]*)\n/;

function recognise(head: Uint8Array, fileName: string): boolean {
  const named = /\.(uff|unv|uf58|ufb)$/i.test(fileName);
  const text = String.fromCharCode(...head.subarray(0, 512));
  if (firstLines.test(text)) return named || !isNumbersOnly(text);
  return named && (/^[ \r\n]*(-(1[ \r\n\d]*)?)?$/.test(text) || head.every((byte) => byte === 0));
}

/** One right-justified number a line is a table of one column. */
function isNumbersOnly(text: string): boolean {
  return text
    .split('\n')
    .slice(0, 6)
    .every((line) => /^\s*[-+.\dEe]*\s*$/.test(line));
}

function header(source: ByteSource): RecordingHeader | Refusal {
  const file = walkUniversal(source);
  if (isRefusal(file)) return file;
  const { responses, cut } = file;
  const disagreement = disagreementOf(file);
  if (disagreement !== null) return disagreement;
  const { start, remark } = startOf(responses);
  const [first] = responses;
  return {
    format: universalReader.format,
    sampleRateHz: first === undefined ? null : 1 / first.intervalS,
    channelNames: channelNames(responses),
    channelUnits: responses.map(({ unit }) => unit),
    samples: 'number',
    framesClaimed: first?.values ?? null,
    complete: cut === null,
    start,
    remarks: [
      ...[...file.leftOut].map(([what, count]) => `${what} left out${count > 1 ? `, ${count} times` : ''}`),
      ...(remark === null ? [] : [remark]),
      ...(cut === null ? [] : [cut]),
    ],
  };
}

/** Why the data sets are no one recording; null where they are, or where more of them may still come. */
function disagreementOf({ responses, leftOut, cut }: UniversalFile): Refusal | null {
  const [first, ...others] = responses;
  if (first === undefined) {
    if (cut !== null) return null;
    const found = leftOut.size === 0 ? 'no data set' : [...leftOut.keys()].slice(0, 4).join(', ');
    return {
      refused: 'unsupported',
      reason: `no time response (data set 58, function type 1) in it, but ${found}`,
    };
  }
  for (const other of others) {
    if (other.values !== first.values)
      return differ(other, `${other.values} values, data set ${first.dataSet} has ${first.values}`);
    if (Math.abs(other.intervalS - first.intervalS) > sameIntervalPpm * 1e-6 * first.intervalS)
      return differ(
        other,
        `a value every ${other.intervalS} s, data set ${first.dataSet} every ${first.intervalS} s`,
      );
  }
  return null;
}

/** An interval has six significant digits. */
const sameIntervalPpm = 10;

function differ({ dataSet }: PlacedResponse, how: string): Refusal {
  return {
    refused: 'unsupported',
    reason: `data set ${dataSet} has ${how}; export recordings of different length or rate to files of their own`,
  };
}

/** By response where that tells them apart, else by the first lines where those do. */
function channelNames(responses: readonly PlacedResponse[]): string[] {
  const tellsApart = (names: readonly string[]) =>
    names.every((name) => name !== '') && new Set(names).size === names.length;
  const byResponse = responses.map(({ response }) => response);
  const byDescription = responses.map(({ description }) => description);
  const names = [byResponse, byDescription].find(tellsApart);
  return distinctNames(
    names ?? byResponse.map((name, index) => (name === '' ? (byDescription[index] ?? '') : name)),
  );
}

/** The start that the data sets agree on. */
function startOf(responses: readonly PlacedResponse[]): {
  readonly start: StatedStart | null;
  readonly remark: string | null;
} {
  const [first] = responses;
  if (first === undefined) return { start: null, remark: null };
  if (responses.some(({ start }) => start?.ms !== first.start?.ms))
    return { start: null, remark: 'the data sets state different starts, none is taken from them' };
  const refused = responses.some(({ startRefused }) => startRefused);
  const remark = refused
    ? 'the third line is no date such as 01-MAY-24 12:00:00, no start is taken from it'
    : null;
  return { start: first.start, remark };
}

function* samples(source: ByteSource): Generator<SampleBlock, SamplesEnd | Refusal> {
  const file = walkUniversal(source);
  if (isRefusal(file)) return file;
  const disagreement = disagreementOf(file);
  if (disagreement !== null) return disagreement;
  const { responses, cut } = file;
  if (responses.length === 0) return { refused: 'damaged', reason: `${cut}; record or export it again` };
  const held = Math.min(...responses.map((response) => response.held));
  const together = Math.floor(samplesPerBlock / responses.length / valuesTogether) * valuesTogether;
  const most = Math.min(Math.max(valuesTogether, together), Math.max(1, held));
  const scratch = new Uint8Array(8 * most);
  const buffer = Math.floor(bufferBytes / responses.length);
  const values = responses.map((response) => universalValues(source, response, buffer, scratch));
  const channels = responses.map(() => new Float64Array(most));
  for (let frame = 0; frame < held; frame += most) {
    const frames = Math.min(most, held - frame);
    for (const [index, one] of values.entries()) {
      const broken = one.fill(channels[index] as Float64Array, frames);
      if (broken !== null) return { refused: 'damaged', reason: broken };
    }
    const full = frames === most;
    yield {
      firstFrame: frame,
      frames,
      channels: full ? channels : channels.map((one) => one.subarray(0, frames)),
    };
  }
  return { frames: held, truncated: cut, timeStepDeviation: null, measuredRateHz: null };
}
