/**
 * Remembers what is costly to make and depends on its key alone. Bounded: the value that was asked for longest ago goes
 * first.
 */
export class Kept<Key, Value> {
  private readonly most: number;
  private readonly values = new Map<Key, Value>();

  /** `most`: values kept at a time, at least 1. */
  constructor(most: number) {
    this.most = most;
  }

  /** The value kept under the key; made now where there is none. */
  get(key: Key, make: () => Value): Value {
    const known = this.values.get(key);
    const value = known === undefined ? make() : known;
    // A map lists its keys in the order in which they came in: what is asked for goes to the end.
    this.values.delete(key);
    this.values.set(key, value);
    if (this.values.size > this.most) {
      for (const oldest of this.values.keys()) {
        this.values.delete(oldest);
        break;
      }
    }
    return value;
  }
}
