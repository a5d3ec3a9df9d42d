/**
 * The densities of single segments, for judging how steady a recording is, in bounded memory: kept one by one until
 * `capacity` are there, then averaged in pairs, and again, so that between half of it and all of it is in use.
 */
export class SegmentSpectra {
  readonly lineCount: number;
  readonly capacity: number;
  private readonly groups: Float32Array[] = [];
  private groupSize = 1;
  private readonly growing: Float64Array;
  private grown = 0;

  /** `lineCount`: lines of a density. `capacity`: groups kept, even, at least 8. Memory: 4 bytes a line and group. */
  constructor(lineCount: number, capacity = 128) {
    if (capacity < 8 || capacity % 2 !== 0)
      throw new RangeError(`capacity = ${capacity}: must be even, at least 8`);
    this.lineCount = lineCount;
    this.capacity = capacity;
    this.growing = new Float64Array(lineCount);
  }

  /** Takes the next segment's density (unit)²/Hz; the array may be reused afterwards. */
  add(density: Float64Array): void {
    const { growing, groups } = this;
    for (let k = 0; k < growing.length; k++) growing[k] += density[k];
    this.grown++;
    if (this.grown < this.groupSize) return;
    const group = new Float32Array(growing.length);
    for (let k = 0; k < group.length; k++) group[k] = growing[k] / this.groupSize;
    groups.push(group);
    growing.fill(0);
    this.grown = 0;
    if (groups.length === this.capacity) this.pair();
  }

  /** Groups of `segmentsPerGroup` segments each. A last group that is not full is left out. */
  get count(): number {
    return this.groups.length;
  }

  get segmentsPerGroup(): number {
    return this.groupSize;
  }

  /** Mean density of a group's segments, in order of time. */
  group(index: number): Float32Array {
    return this.groups[index];
  }

  private pair(): void {
    const { groups } = this;
    for (let i = 0; i < groups.length / 2; i++) {
      const first = groups[2 * i];
      const second = groups[2 * i + 1];
      for (let k = 0; k < first.length; k++) first[k] = 0.5 * (first[k] + second[k]);
      groups[i] = first;
    }
    groups.length /= 2;
    this.groupSize *= 2;
  }
}
