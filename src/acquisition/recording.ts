import type { SampleLayout } from '../config/sample-layout.ts';
import type { SampleUnit, SignalSettings } from '../config/site.ts';

/**
 * What a reader learns of a file before it touches a sample.
 * `channelNames` has one entry a channel: '1', '2', ... for formats without names, the column's heading for text.
 */
export interface RecordingHeader {
  readonly format: string;
  /** Hz; null where the file does not say (text without a time column). */
  readonly sampleRateHz: number | null;
  readonly channelNames: readonly string[];
  /** Unit heading of each channel, where the file has one. */
  readonly channelUnits: readonly (string | null)[];
  /** 'integer': samples come as fractions of full scale, -1 to 1. 'number': samples come as they stand. */
  readonly samples: 'integer' | 'number';
  /** Frames that the header promises; null where only reading tells. Never used to allocate. */
  readonly framesClaimed: number | null;
  /** False while the file is shorter than its own header promises, or the header is not all there yet. */
  readonly complete: boolean;
  /** Set where it is incomplete only because the last of its samples are all zeros, as of a copy still under way. */
  readonly zeroTail?: boolean;
  /** Start that the file states itself; a date without zone is given by its parts and read in the logger's clock. */
  readonly start: StatedStart | null;
  /** What was odd but harmless, for people ("2 unknown chunks skipped"). */
  readonly remarks: readonly string[];
}

/** `zoned`: milliseconds since 1970 UTC; otherwise `ms` is the wall-clock reading as if it were UTC. */
export interface StatedStart {
  readonly ms: number;
  readonly zoned: boolean;
  readonly origin: StartOrigin;
}

export type StartOrigin = 'sidecar' | 'file-name' | 'header' | 'time-column' | 'modification-time';

/** A run of frames; `channels[c]` is a view valid only until the next block is asked for. */
export interface SampleBlock {
  readonly firstFrame: number;
  readonly frames: number;
  readonly channels: readonly Float64Array[];
}

/** Bytes at an offset, however they are stored; so readers need no disk. Returns how many bytes were read. */
export interface ByteSource {
  readonly size: number;
  read(offset: number, into: Uint8Array): number;
}

/** Why a file cannot be used. `foreign`: not this format at all; `damaged`: this format, but broken. */
export interface Refusal {
  readonly refused: 'foreign' | 'damaged' | 'unsupported';
  /** One line for people: what, where in the file, what to do. */
  readonly reason: string;
}

/** How the samples ended: whole, or cut short at a frame with the reason. */
export interface SamplesEnd {
  readonly frames: number;
  readonly truncated: string | null;
  /** Set where a time column was read: the greatest deviation of a step from the mean step, as a ratio. */
  readonly timeStepDeviation: number | null;
  /** Hz, from a time column over the whole file; null without one. */
  readonly measuredRateHz: number | null;
}

/** One format: recognise by the first bytes, header alone, or the samples in blocks of bounded size. */
export interface RecordingReader {
  readonly format: string;
  /** Pure on the first bytes (up to 64 kB) and the file's name; must not throw. */
  recognise(head: Uint8Array, fileName: string): boolean;
  /** Awaited before `header` and before `samples`, by formats whose library is loaded only when it is needed. */
  prepare?(): Promise<void>;
  /** `layout` is what the site file says of files that hold more than samples in one order; left out: nothing. */
  header(source: ByteSource, layout?: SampleLayout): RecordingHeader | Refusal;
  samples(
    source: ByteSource,
    header: RecordingHeader,
    layout?: SampleLayout,
  ): Generator<SampleBlock, SamplesEnd | Refusal>;
}

/** The closed list of data-quality flags. */
export const qualityFlags = [
  'clipped',
  'saturated',
  'flat',
  'dropouts',
  'not-a-number',
  'uneven-time',
  'wrong-rate',
  'too-short',
  'unsteady',
  'settling',
  'repeated-content',
  'late',
  'clock-set-back',
  'clock-ahead',
  'not-running',
  'transient',
  'speed-doubtful',
  'bias-out-of-range',
  'hum-only',
  'low-signal',
  'ski-slope',
] as const;

export type QualityFlag = (typeof qualityFlags)[number];

export interface QualityFinding {
  readonly flag: QualityFlag;
  readonly detail: string;
}

/** `NAME.json` beside a recording, after it was checked: finite numbers, known keys, plain objects. */
export interface Sidecar {
  /** As written; with a zone it is an instant, without one it is read in the logger's clock. */
  readonly start: StatedStart | null;
  readonly speedRpm: number | null;
  readonly loadPercent: number | null;
  /** The logger's own word on the machine. */
  readonly running: boolean | null;
  /** By channel number ('1') or column name. */
  readonly channels: Readonly<Record<string, SidecarChannel>>;
}

export interface SidecarChannel {
  readonly samplesIn?: SampleUnit;
  readonly fullScale?: SignalSettings['fullScale'];
  readonly sensitivity?: SignalSettings['sensitivity'];
}

export function isRefusal(answer: object): answer is Refusal {
  return 'refused' in answer;
}
