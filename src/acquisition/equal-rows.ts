import { qualityRules as rules } from './quality-rules.ts';

/** A row of equal samples, remembered until the whole recording is known. */
interface Row {
  readonly value: number;
  readonly length: number;
  /** Larger of the steps into and out of it. */
  readonly jump: number;
  /** Step into it, or out of it where it begins a stretch. */
  readonly entry: number;
}

/** Rows that are remembered, those with the largest jumps of each value aside: more would say no more. */
const mostRows = 20_000;

/**
 * Follows rows of equal values through the samples. Extremes and resolution are known only at the end, so rows are
 * remembered and judged then; where there are too many, every second is forgotten and each kept one counts double.
 */
export class EqualRows {
  lowest = Number.POSITIVE_INFINITY;
  highest = Number.NEGATIVE_INFINITY;
  /** Smallest difference between neighbouring samples that differ; Infinity where all are equal. */
  step = Number.POSITIVE_INFINITY;
  #rows: Row[] = [];
  #weight = 1;
  #passed = 0;
  #stepSum = 0;
  #steps = 0;
  #value = Number.NaN;
  #length = 0;
  #entry = Number.NaN;

  /** Finite samples, from `from` up to, not including, `to`. */
  add(samples: Float64Array, from: number, to: number): void {
    if (from === to) return;
    let first = from;
    if (this.#length === 0) this.#begin(samples[first++]);
    this.#steps += to - first;
    // Every sample passes here: what changes with it is held in variables.
    let { lowest, highest, step } = this;
    let stepSum = this.#stepSum;
    let row = this.#value;
    let length = this.#length;
    let entry = this.#entry;
    for (let n = first; n < to; n++) {
      const value = samples[n];
      if (value === row) {
        length++;
        continue;
      }
      if (value < lowest) lowest = value;
      if (value > highest) highest = value;
      const jump = Math.abs(value - row);
      if (jump < step) step = jump;
      stepSum += jump;
      if (length >= rules.clippedRow) this.#close(row, length, entry, jump);
      entry = jump;
      row = value;
      length = 1;
    }
    this.lowest = lowest;
    this.highest = highest;
    this.step = step;
    this.#stepSum = stepSum;
    this.#value = row;
    this.#length = length;
    this.#entry = entry;
  }

  #begin(value: number): void {
    if (value < this.lowest) this.lowest = value;
    if (value > this.highest) this.highest = value;
    this.#value = value;
    this.#length = 1;
    this.#entry = Number.NaN;
  }

  /** Ends a stretch: what follows is no neighbour of what came before. */
  end(): void {
    if (this.#length >= rules.clippedRow) this.#close(this.#value, this.#length, this.#entry, Number.NaN);
    this.#value = Number.NaN;
    this.#length = 0;
    this.#entry = Number.NaN;
  }

  /** Remembers a row of at least `clippedRow` samples. `enter`, `exit`: the steps into and out of it, or NaN. */
  #close(value: number, length: number, enter: number, exit: number): void {
    if (this.#passed++ % this.#weight !== 0) return;
    const entry = Number.isNaN(enter) ? exit : enter;
    const jump = Math.max(entry, Number.isNaN(exit) ? entry : exit);
    this.#rows.push({ value, length, jump, entry });
    if (this.#rows.length < mostRows) return;
    this.#rows = this.#rows.filter((_, n) => n % 2 === 0);
    this.#weight *= 2;
  }

  /** Rows at the largest and smallest value that no smooth signal gives. */
  clipped(integer: boolean): { readonly rows: number; readonly samples: number } {
    return this.#count((row) => {
      if (row.value !== this.highest && row.value !== this.lowest) return false;
      return this.#atFullScale(row, integer) || row.entry >= rules.clippedJumpSteps * this.step;
    });
  }

  /** Long rows away from the ends of the range, with a jump at an end, in a signal that is well resolved. */
  dropouts(integer: boolean): { readonly rows: number; readonly samples: number } {
    if (this.#steps === 0 || this.#stepSum / this.#steps < rules.dropoutMeanSteps * this.step) {
      return { rows: 0, samples: 0 };
    }
    return this.#count(
      (row) =>
        row.length >= rules.dropoutRow &&
        row.value !== this.highest &&
        row.value !== this.lowest &&
        !this.#atFullScale(row, integer) &&
        row.jump >= rules.dropoutJumpSteps * this.step,
    );
  }

  #atFullScale({ value }: Row, integer: boolean): boolean {
    return integer && Math.abs(value) >= 1 - 1.5 * Math.min(this.step, rules.coarsestCode);
  }

  #count(wanted: (row: Row) => boolean): { readonly rows: number; readonly samples: number } {
    const rows = this.#rows.filter(wanted);
    return {
      rows: rows.length * this.#weight,
      samples: rows.reduce((sum, row) => sum + row.length, 0) * this.#weight,
    };
  }
}
