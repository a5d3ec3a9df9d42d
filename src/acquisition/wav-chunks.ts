import { readFully } from './byte-source.ts';
import { type ByteSource, isRefusal, type Refusal, type StatedStart } from './recording.ts';
import { type WavFormat, wavFormat } from './wav-format.ts';
import { broadcastStart, broadcastStartBytes } from './wav-start.ts';

/**
 * What the chunks of a WAV file say (RIFF, RIFX, RF64, BW64).
 *
 * A chunk is a 4-character id, a 32-bit size and that many bytes, then one pad byte if the size is odd. The walk
 * reads ids and sizes only, jumps over everything it does not need, and trusts no size further than the file
 * reaches. RF64 (EBU Tech 3306; ITU-R BS.2088 for BW64) keeps 64-bit sizes in a 'ds64' chunk.
 */
export interface WavLayout {
  readonly bigEndian: boolean;
  /** Null while the file ends before them; `missing` then says where. */
  readonly format: WavFormat | null;
  readonly data: WavData | null;
  readonly missing: string | null;
  readonly start: StatedStart | null;
  readonly remarks: readonly string[];
}

export interface WavData {
  readonly offset: number;
  /** Bytes that the header promises; null where it leaves them open, so that the file's end counts. */
  readonly claimedBytes: number | null;
}

const mostChunks = 1000;
const mostRemarks = 10;
const sizeOpen = 0xffffffff;
const sizeOpen64 = 0xffffffffffffffffn;
const fmtBytes = 40;
const ds64Bytes = 28;

/** Ids that recorders commonly write and that hold nothing we need. */
const idleIds = new Set(
  'LIST fact JUNK junk PAD FLLR cue smpl inst PEAK iXML axml chna cart id3 ID3 levl'.split(' '),
);
const usedIds = new Set(['fmt', 'data', 'bext', 'ds64']);

interface Walk {
  readonly source: ByteSource;
  readonly bigEndian: boolean;
  readonly wide: boolean;
  readonly riffBytes: number;
  wideDataBytes: number | null | undefined;
  format: WavFormat | null;
  data: WavData | null;
  start: StatedStart | null;
  readonly remarks: string[];
  readonly unknown: string[];
}

interface Chunk {
  readonly id: string;
  readonly offset: number;
  readonly bytes: number;
}

/**
 * Walks the chunks; `upTo: 'data'` stops where the samples begin, so that a file is read once from front to back,
 * 'end' also reads those behind the samples. Broken chunks ahead of the samples are a refusal, behind them a remark.
 */
export function walkWav(source: ByteSource, upTo: 'data' | 'end'): WavLayout | Refusal {
  const top = new Uint8Array(12);
  const found = readFully(source, 0, top);
  const id = ascii(top, 0, 4);
  const bigEndian = id === 'RIFX';
  const riffBytes = new DataView(top.buffer).getUint32(4, !bigEndian);
  const wide = id === 'RF64' || id === 'BW64';
  const walk: Walk = {
    source,
    bigEndian,
    wide,
    riffBytes,
    wideDataBytes: undefined,
    format: null,
    data: null,
    start: null,
    remarks: [],
    unknown: [],
  };
  if (found < 12 || isZero(top))
    return layoutOf(walk, `the file ends at byte ${found}, inside its first header`);
  if (ascii(top, 8, 12) !== 'WAVE') {
    return { refused: 'foreign', reason: "byte 8: 'WAVE' expected; this is another kind of RIFF file" };
  }
  const missing = walkChunks(walk, upTo);
  return typeof missing === 'object' && missing !== null ? missing : layoutOf(walk, missing);
}

/** Null when all needed is there; text: where the file ends too early; or a refusal. */
function walkChunks(walk: Walk, upTo: 'data' | 'end'): string | Refusal | null {
  const { source } = walk;
  const head = new Uint8Array(8);
  let offset = 12;
  for (let count = 0; count < mostChunks; count++) {
    if (readFully(source, offset, head) < 8) {
      if (walk.data === null) return `the file ends at byte ${source.size}, ahead of its 'data' chunk`;
      if (offset < source.size)
        walk.remarks.push(`${source.size - offset} bytes behind the last chunk left out`);
      return null;
    }
    const raw = ascii(head, 0, 4);
    const bytes = new DataView(head.buffer).getUint32(4, !walk.bigEndian);
    if (!readableId(head, 0)) {
      if (walk.data !== null) {
        walk.remarks.push(`${source.size - offset} bytes behind the last chunk left out`);
        return null;
      }
      if (isZero(head)) return `only zero bytes from byte ${offset} on, ahead of the 'data' chunk`;
      return damaged(`byte ${offset}: a chunk's name expected`, 'the header is broken, record again');
    }
    const chunk: Chunk = { id: raw.trimEnd(), offset: offset + 8, bytes };
    const answer = takeChunk(walk, chunk);
    if (answer !== null) return answer;
    const data = walk.data;
    if (data !== null && (upTo === 'data' || data.claimedBytes === null)) return null;
    const held = data?.offset === chunk.offset ? (data.claimedBytes ?? 0) : bytes;
    offset = chunk.offset + held;
    if (held % 2 === 1) offset = pastPad(walk, offset);
  }
  if (walk.data === null) {
    return damaged(
      `more than ${mostChunks} chunks ahead of the samples`,
      'the header is broken, record again',
    );
  }
  walk.remarks.push(`more than ${mostChunks} chunks, the rest left out`);
  return null;
}

function takeChunk(walk: Walk, chunk: Chunk): string | Refusal | null {
  const { source, bigEndian } = walk;
  const where = `'${chunk.id}' chunk at byte ${chunk.offset - 8}`;
  const payload = (most: number): Uint8Array | null => {
    const bytes = new Uint8Array(Math.min(most, chunk.bytes));
    return readFully(source, chunk.offset, bytes) < bytes.length ? null : bytes;
  };
  const cut = `the file ends at byte ${source.size}, inside its ${where}`;

  if (chunk.id === 'fmt' && walk.format === null) {
    const bytes = payload(fmtBytes);
    if (bytes === null) return cut;
    if (isZero(bytes) && bytes.length >= 16) return `only zero bytes in the ${where}`;
    const format = wavFormat(bytes, chunk.offset, bigEndian);
    if (isRefusal(format)) return format;
    walk.format = format;
    walk.remarks.push(...format.remarks);
  } else if (chunk.id === 'ds64' && walk.wide && walk.data === null) {
    const bytes = payload(ds64Bytes);
    if (bytes === null) return cut;
    if (bytes.length < ds64Bytes)
      return damaged(`${where}: ${bytes.length} bytes, 28 are needed`, 'record again');
    const dataBytes = new DataView(bytes.buffer).getBigUint64(8, true);
    if (dataBytes !== sizeOpen64 && dataBytes > BigInt(Number.MAX_SAFE_INTEGER)) {
      return damaged(`${where}: data size ${dataBytes} bytes`, 'the header is broken, record again');
    }
    walk.wideDataBytes = dataBytes === sizeOpen64 || dataBytes === 0n ? null : Number(dataBytes);
  } else if (chunk.id === 'bext') {
    const bytes = payload(broadcastStartBytes);
    if (bytes === null) return walk.data === null ? cut : null;
    const start = broadcastStart(bytes);
    if (typeof start === 'string') walk.remarks.push(`${where}: ${start}`);
    else walk.start ??= start;
  } else if (chunk.id === 'data') {
    if (walk.data !== null) walk.remarks.push(`a second ${where} left out`);
    else if (walk.format === null) return damaged(`${where} ahead of any 'fmt ' chunk`, 'record again');
    else walk.data = { offset: chunk.offset, claimedBytes: claimedDataBytes(walk, chunk) };
  } else if (!idleIds.has(chunk.id) && !usedIds.has(chunk.id)) {
    walk.unknown.push(chunk.id);
  }
  return null;
}

/** Sizes of 0 and 0xFFFFFFFF are what a recorder leaves that streamed or was cut off: then the file's end counts. */
function claimedDataBytes(walk: Walk, chunk: Chunk): number | null {
  if (chunk.bytes === sizeOpen && typeof walk.wideDataBytes === 'number') return walk.wideDataBytes;
  const finishedEmpty = chunk.bytes === 0 && walk.riffBytes + 8 === walk.source.size;
  if ((chunk.bytes !== 0 && chunk.bytes !== sizeOpen) || finishedEmpty) return chunk.bytes;
  walk.remarks.push(
    'the header leaves the length open (interrupted or streamed): read to the end of the file',
  );
  return null;
}

/**
 * Where the chunk behind `end` begins. Some writers forget the pad byte behind an odd size: taken as missing when
 * the next name can only be read without it, or when only there a name stands that is commonly written.
 */
function pastPad(walk: Walk, end: number): number {
  const bytes = new Uint8Array(5);
  const count = readFully(walk.source, end, bytes);
  if (count < 4 || !readableId(bytes, 0)) return end + 1;
  const readablePadded = count === 5 && readableId(bytes, 1);
  const common = (id: string): boolean => usedIds.has(id.trimEnd()) || idleIds.has(id.trimEnd());
  if (readablePadded && (common(ascii(bytes, 1, 5)) || !common(ascii(bytes, 0, 4)))) return end + 1;
  walk.remarks.push(`no pad byte at byte ${end}`);
  return end;
}

function layoutOf(walk: Walk, missing: string | null): WavLayout {
  const { unknown, remarks, riffBytes, source } = walk;
  if (unknown.length > 0) {
    const names = [...new Set(unknown)].slice(0, 5).join("', '");
    remarks.push(
      `${unknown.length} unknown ${unknown.length === 1 ? 'chunk' : 'chunks'} skipped ('${names}')`,
    );
  }
  const stated = riffBytes !== 0 && riffBytes !== sizeOpen && !walk.wide;
  if (missing === null && stated && riffBytes + 8 !== source.size && walk.data?.claimedBytes != null) {
    remarks.push(`the RIFF header says ${riffBytes + 8} bytes, the file has ${source.size}`);
  }
  if (remarks.length > mostRemarks) {
    remarks.splice(mostRemarks, remarks.length, `and ${remarks.length - mostRemarks} more remarks`);
  }
  const { bigEndian, format, data, start } = walk;
  return { bigEndian, format, data, missing, start, remarks };
}

function damaged(what: string, remedy: string): Refusal {
  return { refused: 'damaged', reason: `${what}; ${remedy}` };
}

function readableId(bytes: Uint8Array, from: number): boolean {
  // A name may be shorter than four letters and end in spaces, never begin with one.
  for (let index = from; index < from + 4; index++) {
    if (bytes[index] < 0x20 || bytes[index] > 0x7e) return false;
  }
  return bytes[from] !== 0x20;
}

function isZero(bytes: Uint8Array): boolean {
  return bytes.every((byte) => byte === 0);
}

function ascii(bytes: Uint8Array, from: number, to: number): string {
  return String.fromCharCode(...bytes.subarray(from, to));
}
