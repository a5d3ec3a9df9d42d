/**
 * The highest density that any segment had, line by line: for eyes, on run-ups and on machines that come and go. A
 * maximum has no averages and no interval, reads noise too high by the harmonic number of the segments (3.0 at 11), and
 * gives no level.
 */
export class PeakHold {
  private readonly highest: Float64Array;

  constructor(lineCount: number) {
    this.highest = new Float64Array(lineCount);
  }

  /** The next segment's density; the array may be used again by the caller. */
  add(density: Float64Array): void {
    const { highest } = this;
    for (let line = 0; line < highest.length; line++) {
      if (density[line] > highest[line]) highest[line] = density[line];
    }
  }

  /** One-sided, (unit of the samples)²/Hz; zero throughout without a segment. */
  finish(): Float64Array {
    return this.highest;
  }
}
