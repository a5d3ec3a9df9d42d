import {
  BandBlocks,
  type BandShape,
  BasebandBand,
  type BlockSize,
  longestBlock,
  ringingSamples,
} from './band-blocks.ts';

export interface DemodulationSettings {
  readonly sampleRateHz: number;
  /** Demodulation band; the filter is half-way up at its edges. */
  readonly fromHz: number;
  readonly toHz: number;
  /** Highest frequency of the envelope that is asked for, at most half the band's width. */
  readonly highestHz: number;
}

/** How a band is demodulated. */
export interface Demodulation extends BlockSize {
  readonly shape: BandShape;
  /** Values of the envelope a second. */
  readonly envelopeRateHz: number;
  /** One value for so many samples. */
  readonly decimation: number;
}

/** Each edge of the filter is this part of the band's width. */
const edgePart = 1 / 16;
const shortestBlock = 1024;
/** Shorter blocks transform more of what is left out, longer ones fall out of the processor's cache. */
const blockOfEdge = 12;

/** Narrowest band that blocks of 2^20 samples can demodulate. */
export function narrowestBandHz(sampleRateHz: number): number {
  return (4 * sampleRateHz * blockOfEdge) / (edgePart * longestBlock);
}

/**
 * Block, ends and rate of a demodulation. The square of the envelope of a band of width B reaches up to B; at a rate of
 * at least B + `highestHz` nothing of it folds back below `highestHz`. Of the envelope itself a twelfth reaches further:
 * in noise, folding may add 1 to 2 % to a level there (measured against the envelope at the full rate).
 *
 * Throws a RangeError on a band that cannot be demodulated.
 */
export function demodulationOf({
  sampleRateHz,
  fromHz,
  toHz,
  highestHz,
}: DemodulationSettings): Demodulation {
  const width = toHz - fromHz;
  const shape = { fromHz, toHz, edgeHz: width * edgePart };
  if (!(width >= narrowestBandHz(sampleRateHz) && fromHz > 0)) {
    throw new RangeError(
      `band from ${fromHz} to ${toHz} Hz: too narrow to be demodulated at ${sampleRateHz} Hz`,
    );
  }
  let decimation = 1;
  const leastRateHz = Math.max(width + shape.edgeHz, width + highestHz);
  while (sampleRateHz / (2 * decimation) >= leastRateHz) decimation *= 2;
  const ringing = ringingSamples(shape, sampleRateHz);
  const edgeSamples = decimation * Math.ceil(ringing / decimation);
  let blockSamples = shortestBlock;
  while (blockSamples < blockOfEdge * ringing) blockSamples *= 2;
  return { shape, blockSamples, edgeSamples, decimation, envelopeRateHz: sampleRateHz / decimation };
}

/** Takes the next values of the envelope, (unit of the samples); the array is lent for the call. */
export type EnvelopeVisitor = (envelope: Float64Array) => void;

/**
 * Envelope of one band of a recording that is fed in blocks of any size: the magnitude of the band's analytic signal
 * (Gabor 1946), not its square. A tone of amplitude A inside the band has the envelope A; (1 + m cos Ωt) cos ωt has
 * 1 + m cos Ωt. The first and last `edgeSamples` of the recording, in which the filter has not rung out, give none.
 *
 * The samples are finite numbers. Throws a RangeError on a band that cannot be demodulated.
 */
export class Demodulator {
  readonly demodulation: Demodulation;
  private readonly blocks: BandBlocks;
  private readonly band: BasebandBand;
  private readonly visitor: EnvelopeVisitor;
  private readonly values: Float64Array;

  constructor(demodulation: Demodulation, sampleRateHz: number, visitor: EnvelopeVisitor) {
    const { shape, blockSamples, decimation } = demodulation;
    this.demodulation = demodulation;
    this.visitor = visitor;
    this.blocks = new BandBlocks(demodulation, (spectrum, good) => {
      this.take(spectrum, 0, good[0]);
      this.take(spectrum, 1, good[1]);
    });
    this.band = new BasebandBand(shape, sampleRateHz, blockSamples, decimation);
    this.values = new Float64Array(this.blocks.hop / decimation);
  }

  add(samples: Float64Array): void {
    this.blocks.add(samples);
  }

  finish(): void {
    this.blocks.finish();
  }

  private take(spectrum: Float64Array, block: 0 | 1, good: number): void {
    if (good === 0) return;
    const { decimation, edgeSamples } = this.demodulation;
    const complex = this.band.envelope(spectrum, block);
    const count = Math.ceil(good / decimation);
    let at = (2 * edgeSamples) / decimation;
    for (let n = 0; n < count; n++, at += 2) {
      this.values[n] = Math.sqrt(complex[at] * complex[at] + complex[at + 1] * complex[at + 1]);
    }
    this.visitor(this.values.subarray(0, count));
  }
}

/** The envelope of samples that are at hand as a whole, one value every `decimation` samples from `edgeSamples` on. */
export function envelopeOf(samples: Float64Array, settings: DemodulationSettings): Float64Array {
  const demodulation = demodulationOf(settings);
  const { edgeSamples, decimation } = demodulation;
  const envelope = new Float64Array(Math.max(0, Math.ceil((samples.length - 2 * edgeSamples) / decimation)));
  let filled = 0;
  const demodulator = new Demodulator(demodulation, settings.sampleRateHz, (values) => {
    envelope.set(values, filled);
    filled += values.length;
  });
  demodulator.add(samples);
  demodulator.finish();
  return envelope;
}
