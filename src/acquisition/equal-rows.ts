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

  add(value: number): void {
    if (value === this.#value) {
      this.#length++;
      this.#steps++;
      return;
    }
    if (value < this.lowest) this.lowest = value;
    if (value > this.highest) this.highest = value;
    const jump = Math.abs(value - this.#value);
    if (this.#length > 0) {
      if (jump < this.step) this.step = jump;
      this.#stepSum += jump;
      this.#steps++;
      this.#close(jump);
    }
    this.#entry = this.#length > 0 ? jump : Number.NaN;
    this.#value = value;
    this.#length = 1;
  }

  /** Ends a stretch: what follows is no neighbour of what came before. */
  end(): void {
    if (this.#length > 0) this.#close(Number.NaN);
    this.#value = Number.NaN;
    this.#length = 0;
    this.#entry = Number.NaN;
  }

  #close(exit: number): void {
    if (this.#length < rules.clippedRow) return;
    if (this.#passed++ % this.#weight !== 0) return;
    const entry = Number.isNaN(this.#entry) ? exit : this.#entry;
    const jump = Math.max(entry, Number.isNaN(exit) ? entry : exit);
    this.#rows.push({ value: this.#value, length: this.#length, jump, entry });
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
