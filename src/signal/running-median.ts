/** Low bits of a double's upper word that are dropped: 7 bits of the fraction stay, so a bin spans 0.4 to 0.8 %. */
const droppedBits = 13;
const binCount = 2 ** (31 - droppedBits);

/** One count per bin; empty between calls. */
const counts = new Uint32Array(binCount);
/** For reading the leading bits of a double and for making one from them; the upper word's place depends on the machine. */
const double = new Float64Array(1);
const words = new Uint32Array(double.buffer);
const upper = new Uint8Array(Uint32Array.of(1).buffer)[0] === 1 ? 1 : 0;

/** Medians of at least 2 x 100 + 1 values are worked out at every fourth and lie on straight lines between. */
const stride = 4;
const wide = 100;

/** The bin of each value: its leading bits, which order as the values do. They are finite and not negative. */
export function binsOf(values: Float64Array): Uint32Array {
  const bins = new Uint32Array(values.length);
  const parts = new Uint32Array(values.buffer, values.byteOffset, 2 * values.length);
  for (let i = 0; i < bins.length; i++) bins[i] = parts[2 * i + upper] >>> droppedBits;
  return bins;
}

/**
 * Median of every value and its `reach` neighbours on either side, to 0.5 %, from the values' bins (`binsOf`). Near
 * the ends the reach shrinks to the distance from the end, so that a slope biases nothing, but not below
 * `leastReach`; nearer still, the last median that reaches so far is repeated. Fewer than 2 leastReach + 1 values have
 * one common median.
 *
 * A histogram over the bins slides along with a pointer to its median (Huang, Yang & Tang 1979): a few operations a
 * value, whatever the reach.
 */
export function runningMedian(bins: Uint32Array, reach: number, leastReach: number): Float64Array {
  const length = bins.length;
  const medians = new Float64Array(length);
  if (length === 0) return medians;
  const least = Math.min(leastReach, Math.floor((length - 1) / 2));
  const last = length - 1 - least;
  let from = 0;
  let to = -1;
  let bin = 0;
  let below = 0;
  let previous = least;
  for (let i = least; ; ) {
    const side = Math.max(least, Math.min(reach, i, length - 1 - i));
    // The sign bit of the difference counts without a branch that would be guessed wrong half the time.
    while (to < i + side) {
      const added = bins[++to];
      counts[added]++;
      below += (added - bin) >>> 31;
    }
    while (from < i - side) {
      const removed = bins[from++];
      counts[removed]--;
      below -= (removed - bin) >>> 31;
    }
    const rank = (to - from) >> 1;
    while (below > rank) below -= counts[--bin];
    while (below + counts[bin] <= rank) below += counts[bin++];
    const low = binEdge(bin);
    medians[i] = low + ((rank - below + 0.5) / counts[bin]) * (binEdge(bin + 1) - low);
    interpolate(medians, previous, i);
    previous = i;
    if (i === last) break;
    // Wide windows change little from one value to the next.
    i = Math.min(last, i + (side >= wide ? stride : 1));
  }
  for (; from <= to; from++) counts[bins[from]]--;
  medians.fill(medians[least], 0, least);
  medians.fill(medians[last], last + 1, length);
  return medians;
}

function interpolate(medians: Float64Array, from: number, to: number): void {
  const slope = (medians[to] - medians[from]) / (to - from);
  for (let i = from + 1; i < to; i++) medians[i] = medians[from] + slope * (i - from);
}

function binEdge(bin: number): number {
  words[upper] = bin << droppedBits;
  words[1 - upper] = 0;
  return double[0];
}
