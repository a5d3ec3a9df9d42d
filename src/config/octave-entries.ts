import { isMap, isPair, isScalar, type Node } from 'yaml';
import { type OctaveFraction, octaveBands } from '../signal/octaves.ts';
import type { Reading } from './reading.ts';
import type { bandKeys, octaveKeys } from './schema-bands.ts';
import type { Shape, Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';

type WrittenBand = Written<ReadMap<typeof bandKeys>>;
type WrittenOctaves = Written<ReadMap<typeof octaveKeys>>;

/** Whether an entry of a list of bands stands for the octave bands of a range. */
export function isOctaveEntry(entry: Node, reading: Reading): boolean {
  const node = reading.resolve(entry);
  return (
    isMap(node) &&
    node.items.some((pair) => isPair(pair) && isScalar(pair.key) && pair.key.value === 'octaves')
  );
}

/** An entry of a list of bands: one band, or those that an entry with `octaves` stands for. */
export function bandsOrOctaves(
  band: Shape<ReadMap<typeof bandKeys>>,
  octaves: Shape<ReadMap<typeof octaveKeys>>,
): Shape<readonly WrittenBand[]> {
  return {
    read: (entry, name, reading) => {
      if (!isOctaveEntry(entry, reading)) {
        const one = band.read(entry, name, reading);
        return one === null ? null : { value: [one], at: one.at };
      }
      const written = octaves.read(entry, name, reading);
      return written === null ? null : { value: octaveEntry(written, reading), at: written.at };
    },
    jsonSchema: { anyOf: [band.jsonSchema, octaves.jsonSchema] },
    example: band.example,
    ...(band.below === undefined ? {} : { below: band.below }),
  };
}

/** 'third-31.5Hz', 'octave-1000Hz', with the entry's own id before them where it has one. */
function octaveEntry(written: WrittenOctaves, reading: Reading): WrittenBand[] {
  const { keys, has } = written.value;
  const { octaves, from, to, id, of, quantity, unit } = keys;
  if (octaves === null || from === null || to === null || (has.has('id') && id === null)) return [];
  if (from.value.inOrders || to.value.inOrders) {
    const edge = from.value.inOrders ? from : to;
    reading.problem(edge.at, 'octave bands stand at fixed frequencies', 'give from and to in Hz');
    return [];
  }
  const fraction: OctaveFraction = octaves.value === '1/1' ? 1 : 3;
  const bands = octaveBands(fraction, from.value.value, to.value.value);
  if (bands.length === 0) {
    const what = `no nominal mid-band of ${octaves.value} octaves lies from ${from.value.value} to ${to.value.value} Hz`;
    reading.problem(to.at, what, 'name the lowest and the highest mid-band, such as from: 25 Hz, to: 10 kHz');
    return [];
  }
  const before = id === null ? '' : `${id.value}-`;
  const kind = fraction === 1 ? 'octave' : 'third';
  return bands.map(({ nominalHz, fromHz, toHz }) => ({
    at: written.at,
    value: {
      has: new Set([...has, 'id']),
      keys: {
        id: { value: `${before}${kind}-${nominalHz}Hz`, at: id?.at ?? octaves.at },
        formerly: null,
        from: { value: { value: fromHz, inOrders: false }, at: from.at },
        to: { value: { value: toHz, inOrders: false }, at: to.at },
        of,
        quantity,
        unit,
      },
    },
  }));
}
