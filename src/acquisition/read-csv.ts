import { bytesSource, headBytes, readFully, readHead } from './byte-source.ts';
import { csvDialect } from './csv-dialect.ts';
import { csvRows } from './csv-rows.ts';
import { type CsvTable, csvTable, noNumbers } from './csv-table.ts';
import {
  type ByteSource,
  isRefusal,
  type RecordingHeader,
  type RecordingReader,
  type Refusal,
  type SampleBlock,
  type SamplesEnd,
} from './recording.ts';

/** Samples of all channels in one block: 1 MiB of numbers. */
const samplesPerBlock = 131_072;
const headerRows = 8192;
const tailBytes = 4096;
/** Of a file called .csv, so many control characters in a hundred mean that it is no text. */
const mostControlPercent = 2;

/**
 * Text with columns of samples: comma, semicolon, tab or blanks between them, decimal point or comma, headings,
 * unit rows and remarks ahead of the numbers, a time column or none. Memory is a text buffer of 256 kB and one block
 * of numbers. Reports: damaged (a line named, or no numbers at all), unsupported (UTF-16, too many columns, an
 * unknown unit of time), truncated (a last line cut short, or zero bytes to the end).
 */
export const csvReader: RecordingReader = { format: 'CSV', recognise, header, samples };

function recognise(head: Uint8Array, fileName: string): boolean {
  const named = /\.(csv|tsv)$/i.test(fileName);
  if (named && head[0] >= 0xfe && head[0] + head[1] === 0x1fd) return true;
  const zero = head.indexOf(0);
  const zerosToEnd = zero >= 0 && head.subarray(zero).every((byte) => byte === 0);
  const text = zerosToEnd ? head.subarray(0, zero) : head;
  let control = 0;
  for (const byte of text) if (byte < 0x20 && (byte < 0x09 || byte > 0x0d) && byte !== 0x1a) control++;
  if (named) return control * 100 <= text.length * mostControlPercent;
  // Under any other name the contents alone must show rows of numbers.
  if (control > 0) return false;
  const dialect = csvDialect(text, text.length < headBytes);
  return dialect !== null && !isRefusal(dialect);
}

function header(source: ByteSource): RecordingHeader | Refusal {
  const table = csvTable(source);
  if (table === null) return { ...headerOf(null), remarks: ['no row of numbers yet'] };
  if (isRefusal(table)) return table;
  // The whole lines of the first bytes are enough for a first idea of the rate.
  const head = readHead(source);
  const end = head.length === source.size ? head.length : head.lastIndexOf(table.dialect.lineEnd) + 1;
  const rows = csvRows(bytesSource(head.subarray(0, end)), table);
  rows.fill([], headerRows);
  const rateHz = rows.steps?.result(rows.timeUnitS).rateHz ?? null;
  const remarks: string[] = [];
  if (table.timeColumn >= 0 && rateHz === null) remarks.push('the time column does not run forward');
  const complete = !endsInZeros(source);
  if (!complete) remarks.push('zero bytes at the end: perhaps not copied yet');
  return { ...headerOf(table), sampleRateHz: rateHz, complete, start: rows.start, remarks };
}

function headerOf(table: CsvTable | null): RecordingHeader {
  return {
    format: csvReader.format,
    sampleRateHz: null,
    channelNames: table?.channelNames ?? [],
    channelUnits: table?.channelUnits ?? [],
    samples: 'number',
    framesClaimed: null,
    complete: false,
    start: null,
    remarks: [],
  };
}

function endsInZeros(source: ByteSource): boolean {
  const tail = new Uint8Array(Math.min(tailBytes, source.size));
  const count = readFully(source, source.size - tail.length, tail);
  return count < tail.length || tail[tail.length - 1] === 0;
}

function* samples(source: ByteSource): Generator<SampleBlock, SamplesEnd | Refusal> {
  const table = csvTable(source);
  if (table === null) return { refused: 'damaged', reason: noNumbers(`${source.size} bytes`) };
  if (isRefusal(table)) return table;
  const rows = csvRows(source, table);
  const channelCount = table.channelColumns.length;
  // A row has at least two bytes a column, number and delimiter, so a short file needs no long block.
  const mostRows = Math.ceil(source.size / (2 * table.dialect.columns)) + 1;
  const blockFrames = Math.min(Math.floor(samplesPerBlock / channelCount), mostRows);
  const channels = Array.from({ length: channelCount }, () => new Float64Array(blockFrames));
  let firstFrame = 0;
  while (rows.end === null) {
    const frames = rows.fill(channels, blockFrames);
    if (frames > 0) {
      const full = frames === blockFrames;
      yield { firstFrame, frames, channels: full ? channels : channels.map((c) => c.subarray(0, frames)) };
    }
    firstFrame += frames;
  }
  const { end } = rows;
  if (typeof end === 'object' && isRefusal(end)) return end;
  const time = rows.steps?.result(rows.timeUnitS) ?? null;
  return {
    frames: firstFrame,
    truncated: typeof end === 'object' ? end.truncated : null,
    timeStepDeviation: time?.deviation ?? null,
    measuredRateHz: time?.rateHz ?? null,
  };
}
