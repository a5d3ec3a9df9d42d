/**
 * The service's clocks. Wall time dates what people read; monotonic time measures waits; recordings bring their
 * own time. A decision reads a clock once. `every` is the only source of ticks, so that tests and the demo can
 * run the whole service in time-lapse.
 */
export interface Clock {
  /** Milliseconds since 1970 UTC; may step. */
  wallMs(): number;
  /** Milliseconds since an arbitrary start; never steps back. */
  monotonicMs(): number;
}

export const systemClock: Clock = {
  wallMs: () => Date.now(),
  monotonicMs: () => performance.now(),
};

/** A clock that stands still until it is moved; wall and monotonic time can be moved apart. */
export class SteppedClock implements Clock {
  #wall: number;
  #monotonic = 0;

  constructor(wallMs: number) {
    this.#wall = wallMs;
  }

  wallMs(): number {
    return this.#wall;
  }

  monotonicMs(): number {
    return this.#monotonic;
  }

  /** Time passes: both clocks go on. */
  advance(ms: number): void {
    if (ms < 0) throw new Error(`time cannot pass backwards (${ms} ms); use setWall to step the wall clock`);
    this.#wall += ms;
    this.#monotonic += ms;
  }

  /** Somebody sets the machine's clock. */
  setWall(wallMs: number): void {
    this.#wall = wallMs;
  }
}
