import { BandBlocks, BasebandBand, longestBlock, ringingSamples } from './band-blocks.ts';
import { kurtosisOfNoise, worthOfValue } from './kurtosis-noise.ts';

export interface KurtogramSettings {
  readonly sampleRateHz: number;
  /** Bands that lie between these frequencies take part. */
  readonly lowestHz: number;
  readonly highestHz: number;
  /** Bands narrower than this do not. */
  readonly narrowestHz: number;
}

/** One band of the map. */
export interface KurtogramBand {
  readonly fromHz: number;
  readonly toHz: number;
  /** Of the complex envelope, 0 for stationary Gaussian noise, -1 for a steady tone. */
  readonly kurtosis: number;
  /** What the largest of all bands exceeds in one recording of a thousand of nothing but noise, at this width. */
  readonly noisePoint: number;
}

export interface KurtogramResult {
  readonly bands: readonly KurtogramBand[];
  /**
   * Of the bands above their noise point the one of largest kurtosis; where there is none, the one that comes nearest
   * to its own. Null without bands, or without enough samples.
   */
  readonly best: KurtogramBand | null;
  readonly passes: boolean;
}

/** Into how many bands the range up to half the sample rate is cut, level by level (Antoni 2007): halves, with thirds between. */
const levels = [1, 2, 3, 4, 6, 8, 12, 16, 24, 32, 48, 64];
/** Each edge of a band's filter is this part of its width. */
const edgePart = 1 / 4;
const shortestBlock = 8192;
const blockOfEdge = 12;
/** One recording of noise in a thousand has a band above its noise point. */
const noiseProbability = 0.001;

interface MapBand {
  readonly fromHz: number;
  readonly toHz: number;
  readonly band: BasebandBand;
  /** Independent values that one is worth. */
  readonly worth: number;
  count: number;
  squares: number;
  fourths: number;
}

/**
 * Kurtosis over centre frequency and width, for finding the band in which short shocks stand out: the map of the fast
 * kurtogram (Antoni 2007, MSSP 21, 108-124), its bands cut out by transforms of blocks in place of trees of filters. Fed in
 * blocks of any size, finite numbers; holds two blocks, never the recording.
 *
 * The noise point of a band is its share, over all bands, of the 99.9 % point of the map (`kurtosis-noise.ts`).
 */
export class Kurtogram {
  private readonly blocks: BandBlocks;
  private readonly bands: readonly MapBand[];

  constructor(settings: KurtogramSettings) {
    const layout = layoutOf(settings);
    this.blocks = new BandBlocks(layout, (spectrum, good) => this.take(spectrum, good));
    this.bands = layout.bands;
  }

  add(samples: Float64Array): void {
    this.blocks.add(samples);
  }

  finish(): KurtogramResult {
    this.blocks.finish();
    const probability = noiseProbability / this.bands.length;
    const bands = this.bands
      .filter(({ squares }) => squares > 0)
      .map(({ fromHz, toHz, worth, count, squares, fourths }) => ({
        fromHz,
        toHz,
        kurtosis: (count * fourths) / (squares * squares) - 2,
        noisePoint: kurtosisOfNoise(count * worth, probability),
      }));
    const passing = bands.filter(({ kurtosis, noisePoint }) => kurtosis > noisePoint);
    if (passing.length > 0)
      return { bands, best: largest(passing, ({ kurtosis }) => kurtosis), passes: true };
    const judged = bands.filter(({ noisePoint }) => noisePoint < Number.POSITIVE_INFINITY);
    const best = largest(judged, ({ kurtosis, noisePoint }) => kurtosis / noisePoint);
    return { bands, best, passes: false };
  }

  private take(spectrum: Float64Array, good: readonly [number, number]): void {
    const { edgeSamples } = this.blocks.size;
    for (const one of this.bands) {
      const { band } = one;
      for (const block of [0, 1] as const) {
        if (good[block] === 0) continue;
        const complex = band.envelope(spectrum, block);
        const count = Math.ceil(good[block] / band.decimation);
        const from = (2 * edgeSamples) / band.decimation;
        let squares = 0;
        let fourths = 0;
        for (let at = from; at < from + 2 * count; at += 2) {
          const square = complex[at] * complex[at] + complex[at + 1] * complex[at + 1];
          squares += square;
          fourths += square * square;
        }
        one.count += count;
        one.squares += squares;
        one.fourths += fourths;
      }
    }
  }
}

function largest(bands: readonly KurtogramBand[], of: (band: KurtogramBand) => number): KurtogramBand | null {
  let best: KurtogramBand | null = null;
  for (const band of bands) if (best === null || of(band) > of(best)) best = band;
  return best;
}

/** The bands that take part, coarsest level first, and blocks in which the narrowest filter rings out. */
function layoutOf({ sampleRateHz, lowestHz, highestHz, narrowestHz }: KurtogramSettings) {
  const edges: { fromHz: number; toHz: number; inHalf: number }[] = [];
  for (const inHalf of levels) {
    const width = sampleRateHz / (2 * inHalf);
    if (width < narrowestHz) continue;
    for (let i = 0; i < inHalf; i++) {
      const [fromHz, toHz] = [i * width, (i + 1) * width];
      if (fromHz >= lowestHz && toHz <= highestHz * (1 + 1e-9)) edges.push({ fromHz, toHz, inHalf });
    }
  }
  const most = Math.max(1, ...edges.map(({ inHalf }) => inHalf));
  const ringing = ringingSamples({ edgeHz: (edgePart * sampleRateHz) / (2 * most) }, sampleRateHz);
  let blockSamples = shortestBlock;
  while (blockSamples < blockOfEdge * ringing && blockSamples < longestBlock) blockSamples *= 2;
  let coarsest = 1;
  const bands = edges.map(({ fromHz, toHz, inHalf }): MapBand => {
    const width = toHz - fromHz;
    // The edges lie inside, so that a band's lines just fill the lower rate.
    const edgeHz = edgePart * width;
    const shape = { fromHz: fromHz + edgeHz / 2, toHz: toHz - edgeHz / 2 - 1e-9 * width, edgeHz };
    let decimation = 1;
    while (decimation <= inHalf) decimation *= 2;
    coarsest = Math.max(coarsest, decimation);
    const band = new BasebandBand(shape, sampleRateHz, blockSamples, decimation);
    const worth = worthOfValue(band.amplitudes, blockSamples / decimation);
    return { fromHz, toHz, band, worth, count: 0, squares: 0, fourths: 0 };
  });
  return { blockSamples, edgeSamples: coarsest * Math.ceil(ringing / coarsest), bands };
}
