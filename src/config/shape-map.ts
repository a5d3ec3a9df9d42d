import { isMap, isScalar, type Node, type Pair, type YAMLMap } from 'yaml';
import { nearest } from './nearest.ts';
import { shorten } from './quantity.ts';
import type { Reading } from './reading.ts';
import { isEmptyValue, type JsonSchema, type Shape, spanOf, type Written } from './shape.ts';
import { remedyForComma, splitAtComma } from './traps.ts';

/** One entry of a table of keys. */
export interface Key<T> {
  readonly shape: Shape<T>;
  /** What it means, in the JSON Schema and in messages. */
  readonly says: string;
  readonly required: boolean;
  /** The value used where the key is absent, as it would be typed. */
  readonly fallback: string | null;
}

export function key<T>(
  shape: Shape<T>,
  says: string,
  {
    required = false,
    fallback = null,
  }: { readonly required?: boolean; readonly fallback?: string | null } = {},
): Key<T> {
  return { shape, says, required, fallback };
}

// biome-ignore lint/suspicious/noExplicitAny: a table holds keys of every type; ReadOf gives each its own back.
export type Keys = { readonly [name: string]: Key<any> };

/** What a map was read as: null where a key is absent or its problem was told (`has` tells the two apart). */
export type ReadOf<K extends Keys> = {
  readonly [P in keyof K]: K[P] extends Key<infer T> ? Written<T> | null : never;
};

export interface ReadMap<K extends Keys> {
  readonly keys: ReadOf<K>;
  /** Names written, also those whose value was refused. */
  readonly has: ReadonlySet<string>;
}

/** A group of known keys. Unknown ones are refused with the nearest known, doubled ones with the line of the first. */
export function map<K extends Keys>(keys: K): Shape<ReadMap<K>> {
  const names = Object.keys(keys);
  const read = (written: Node, name: string, reading: Reading): Written<ReadMap<K>> | null => {
    const node = reading.resolve(written);
    const at = spanOf(written);
    if (!isMap(node)) {
      reading.problem(at, ...noGroup(node, name, names, (text) => reading.write(at, text)));
      return null;
    }
    const found: Record<string, Written<unknown> | null> = Object.fromEntries(
      names.map((known) => [known, null]),
    );
    const has = new Set<string>();
    eachPair(node, name, reading, (label, value, keyNode) => {
      if (!Object.hasOwn(keys, label)) {
        const meant = unknownKey(reading, keyNode, label, name, names);
        if (meant !== null) has.add(meant);
        return;
      }
      has.add(label);
      if (value !== null) found[label] = keys[label].shape.read(value, label, reading);
    });
    for (const known of names) {
      if (!keys[known].required || has.has(known)) continue;
      const id = found.id?.value;
      const which = typeof id === 'string' ? ` '${shorten(id)}'` : '';
      const { example, below } = keys[known].shape;
      const right =
        below === undefined ? `add: ${known}: ${example}` : `add ${known}: with its keys indented below`;
      reading.problem(at, `${name}${which} has no ${known}`, right);
    }
    return { value: { keys: found as ReadOf<K>, has }, at };
  };
  const below = names.map((known) => [known, keys[known].shape] as const);
  return { read, jsonSchema: mapSchema(keys, names), below, example: '...' };
}

function noGroup(
  node: Node,
  name: string,
  names: readonly string[],
  write: (text: string) => string,
): readonly [string, string] {
  if (isEmptyValue(node)) {
    return [
      `${name} is a group of keys, and none stands here`,
      'write its keys indented below it, or remove the line',
    ];
  }
  const glued = isScalar(node) ? /^([a-z_]+):(\S.*)$/s.exec(String(node.value)) : null;
  if (glued !== null && names.includes(glued[1])) {
    return [`the colon after ${glued[1]} lacks its space`, write(`${glued[1]}: ${glued[2]}`)];
  }
  return [`${name} is a group of keys`, `its keys are ${names.join(', ')}`];
}

/** A group whose keys are ids of people's own. */
export function mapById<T>(
  id: Shape<string>,
  item: Shape<T>,
  most: number,
): Shape<ReadonlyMap<string, Written<T>>> {
  const read = (
    written: Node,
    name: string,
    reading: Reading,
  ): Written<ReadonlyMap<string, Written<T>>> | null => {
    const node = reading.resolve(written);
    const at = spanOf(written);
    if (!isMap(node) || node.items.length > most) {
      const what = isMap(node) ? `${name} has more than ${most} entries` : `${name} is a group of ids`;
      reading.problem(
        at,
        what,
        isMap(node) ? 'shorten it' : 'write each id, a colon, and its keys indented below',
      );
      return null;
    }
    const entries = new Map<string, Written<T>>();
    eachPair(node, name, reading, (label, value, keyNode) => {
      if (id.read(keyNode, `the id '${shorten(label)}'`, reading) === null || value === null) return;
      const one = item.read(value, `${name} '${shorten(label)}'`, reading);
      if (one !== null) entries.set(label, one);
    });
    return { value: entries, at };
  };
  return {
    read,
    jsonSchema: { type: 'object', additionalProperties: item.jsonSchema },
    example: '...',
    below: item.below,
  };
}

type Visit = (label: string, value: Node | null, keyNode: Node) => void;

function eachPair(node: YAMLMap, name: string, reading: Reading, visitPair: Visit): void {
  const lines = new Map<string, number>();
  for (let index = 0; index < node.items.length; index++) {
    const pair = node.items[index] as Pair<Node | null, Node | null>;
    const keyNode = pair.key === null ? null : reading.resolve(pair.key);
    if (!reading.enter(spanOf(node))) return;
    if (!isScalar(keyNode)) {
      reading.problem(spanOf(keyNode ?? node), `a key of ${name} is not a word`, 'write: key: value');
      continue;
    }
    const label = String(keyNode.value);
    const at = spanOf(keyNode);
    const first = lines.get(label);
    if (first !== undefined) {
      const what = `${shorten(label)} stands twice in ${name}, first in line ${first}`;
      reading.problem(at, what, 'keep one of the two');
    }
    const cut = splitAtComma(node, index, reading.text);
    if (cut !== null) {
      const { what, replacement } = remedyForComma(cut.whole);
      reading.problem(cut.span, what, reading.write(cut.span, replacement));
      index += cut.pieces;
    }
    if (pair.value === null)
      reading.problem(at, `${shorten(label)} has no value`, `write: ${shorten(label)}: ...`);
    if (first === undefined) {
      lines.set(label, reading.lineOf(at));
      visitPair(label, cut === null ? pair.value : null, keyNode);
    }
  }
}

/** Tells it; returns the key of this group that was meant, so that it is not told as missing too. */
function unknownKey(
  reading: Reading,
  node: Node,
  label: string,
  name: string,
  names: readonly string[],
): string | null {
  const at = spanOf(node);
  const meant = nearest(label, names);
  const homes = meant === null || !sameWord(meant, label) ? reading.homes.get(label) : undefined;
  const what = `unknown key '${shorten(label)}' in ${name}`;
  if (homes !== undefined) reading.problem(at, what, `it belongs under ${homes.join(' or ')}`);
  else if (meant !== null) reading.problem(at, what, reading.write(at, meant));
  else reading.problem(at, what, `known here are ${names.join(', ')}`);
  return homes === undefined ? meant : null;
}

function sameWord(a: string, b: string): boolean {
  return a.replaceAll('_', '') === b.toLowerCase().replace(/[\s_-]/g, '');
}

/** Where each key may stand: 'settle' -> 'recordings'. */
export function keyHomes(shape: Shape<unknown>, name: string): Map<string, string[]> {
  const homes = new Map<string, string[]>();
  const walk = (current: Shape<unknown>, under: string) => {
    for (const [label, next] of current.below ?? []) {
      const known = homes.get(label) ?? [];
      if (!known.includes(under)) homes.set(label, [...known, under]);
      walk(next, label);
    }
  };
  walk(shape, name);
  return homes;
}

function mapSchema(keys: Keys, names: readonly string[]): JsonSchema {
  const properties = Object.fromEntries(
    names.map((name) => {
      const { shape, says, fallback } = keys[name];
      const described = fallback === null ? says : `${says} Without it: ${fallback}.`;
      return [name, { description: described, ...shape.jsonSchema }];
    }),
  );
  const required = names.filter((name) => keys[name].required);
  return {
    type: 'object',
    properties,
    ...(required.length > 0 ? { required } : {}),
    additionalProperties: false,
  };
}
