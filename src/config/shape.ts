import { isAlias, isMap, isScalar, isSeq, type Node } from 'yaml';
import { nearest } from './nearest.ts';
import { type Parsed, shorten } from './quantity.ts';
import type { Reading } from './reading.ts';
import { asYaml, type Span } from './site-text.ts';
import { eatenByComment } from './traps.ts';

export type JsonSchema = { readonly [key: string]: unknown };

/** A value with where it stands. */
export interface Written<T> {
  readonly value: T;
  readonly at: Span;
}

/**
 * What may stand in one place of the site file. `read` returns null after it has told the problem; the same shape
 * gives the JSON Schema, so that editor and program never disagree.
 */
export interface Shape<T> {
  readonly read: (node: Node, name: string, reading: Reading) => Written<T> | null;
  readonly jsonSchema: JsonSchema;
  /** Keys below, for 'belongs under'. */
  readonly below?: readonly (readonly [string, Shape<unknown>])[];
  /** A value as typed, for 'write: ...' where nothing better is known. */
  readonly example: string;
}

export function spanOf(node: Node): Span {
  const range = node.range ?? [0, 0, 0];
  return { from: range[0], to: range[1] };
}

export interface ScalarFacts {
  readonly example: string;
  readonly pattern?: string;
  readonly choices?: readonly string[];
  /** A text of people's own: a comment sign directly before a character there is a trap. */
  readonly free?: boolean;
  readonly most?: number;
}

/** One value on its line, understood by `parse` from its text as written. */
export function scalar<T>(parse: (text: string) => Parsed<T>, facts: ScalarFacts): Shape<T> {
  const { example, pattern, choices, free = false, most = 200 } = facts;
  const jsonSchema: JsonSchema =
    choices === undefined
      ? { type: ['string', 'number'], ...(pattern === undefined ? {} : { pattern }) }
      : { enum: choices };
  const read = (written: Node, name: string, reading: Reading): Written<T> | null => {
    const node = reading.resolve(written);
    const at = spanOf(written);
    if (!isScalar(node)) {
      const right = `write: ${name}: ${example}`;
      reading.problem(at, `${name} is one value, not ${isMap(node) ? 'a group of keys' : 'a list'}`, right);
      return null;
    }
    const eaten = free ? eatenByComment(node, reading.text) : null;
    if (eaten !== null) {
      const kept = String(node.value) === '' ? 'empty' : `only '${shorten(String(node.value))}'`;
      const what = `'#' begins a comment, so ${name} is ${kept}`;
      const meant = parse(eaten.whole);
      const text = meant.ok ? eaten.whole : (meant.instead ?? eaten.whole);
      reading.problem(at, what, reading.write(eaten.span, asYaml(text)));
      return null;
    }
    const text = String(node.value);
    if (text.trim() === '') {
      reading.problem(at, `${name} has no value`, `write: ${name}: ${example}`);
      return null;
    }
    if (text.length > most) {
      reading.problem(at, `${name} is longer than ${most} characters`, 'shorten it');
      return null;
    }
    const parsed = parse(text);
    if (parsed.ok) return { value: parsed.value, at };
    const instead = parsed.instead;
    const right =
      instead === null ? `write for example: ${name}: ${example}` : reading.write(at, asYaml(instead));
    reading.problem(at, `${name}: ${parsed.what}`, right);
    return null;
  };
  return { read, jsonSchema, example };
}

/** A list of such things, at most `most`; at least one unless `empty`. */
export function list<T>(item: Shape<T>, most: number, empty = false): Shape<readonly Written<T>[]> {
  const example = `[${item.example}]`;
  const read = (written: Node, name: string, reading: Reading): Written<readonly Written<T>[]> | null => {
    const node = reading.resolve(written);
    const at = spanOf(written);
    if (!isSeq(node)) {
      const single = isScalar(node) && node.value !== '' && isScalarShape(item);
      const right = single
        ? reading.write(at, `[${asYaml(String(node.value), true)}]`)
        : "begin each entry with '- '";
      reading.problem(at, `${name} is a list`, right);
      return null;
    }
    if (node.items.length > most || (node.items.length === 0 && !empty)) {
      const what =
        node.items.length > most ? `${name} has more than ${most} entries` : `${name} is an empty list`;
      reading.problem(
        at,
        what,
        node.items.length > most ? 'shorten it' : `write: ${name}: ${example}, or leave it out`,
      );
      return null;
    }
    const value: Written<T>[] = [];
    let whole = true;
    for (const entry of node.items) {
      const one = reading.enter(at) ? item.read(entry as Node, `an entry of ${name}`, reading) : null;
      if (one === null) whole = false;
      else value.push(one);
    }
    return whole || value.length > 0 ? { value, at } : null;
  };
  return { read, jsonSchema: { type: 'array', items: item.jsonSchema }, example, below: item.below };
}

function isScalarShape(shape: Shape<unknown>): boolean {
  return shape.jsonSchema.type !== 'object';
}

/** One of a closed list of words. */
export function choice<const T extends string>(words: readonly T[], example: T = words[0]): Shape<T> {
  return scalar(
    (text) => {
      const found = words.find((word) => word === text.trim());
      if (found !== undefined) return { ok: true, value: found };
      const what = `'${shorten(text)}' is none of ${words.join(', ')}`;
      return { ok: false, what, instead: nearest(text, words) };
    },
    { example, choices: words },
  );
}

/** yes/no. Words as YAML 1.2 has them; `yes` and `on` are told apart from a text by the remedy. */
export const trueOrFalse: Shape<boolean> = {
  ...scalar<boolean>(
    (text) => {
      if (text === 'true' || text === 'false') return { ok: true, value: text === 'true' };
      const meant = /^(yes|on|y|true|1)$/i.test(text)
        ? 'true'
        : /^(no|off|n|false|0)$/i.test(text)
          ? 'false'
          : null;
      return { ok: false, what: `'${shorten(text)}' is neither true nor false`, instead: meant };
    },
    { example: 'true' },
  ),
  jsonSchema: { type: 'boolean' },
};

/**
 * Text of people's own, on one line unless `lines`. Escapes in double quotes can make control characters, which
 * would end up in mail headers and terminals, so they are refused here too.
 */
export function words(most: number, example: string, { lines = false } = {}): Shape<string> {
  const refusedCharacters = lines ? /[^\P{Cc}\n\t]/u : /\p{Cc}/u;
  return scalar<string>(
    (text) => {
      const value = text.trim();
      if (!refusedCharacters.test(value)) return { ok: true, value };
      const instead = value.replace(/\p{Cc}+/gu, ' ');
      return { ok: false, what: 'the text holds a line break or control character', instead };
    },
    { example, free: true, most },
  );
}

/** A number without a unit (a port, a count, a share). */
export function plainNumber(least: number, most: number, whole: boolean, example: string): Shape<number> {
  return {
    ...scalar<number>(
      (text) => {
        const value = /^\d+(\.\d+)?$/.test(text) ? Number(text) : Number.NaN;
        if (value >= least && value <= most && (!whole || Number.isInteger(value)))
          return { ok: true, value };
        const kind = whole ? 'a whole number' : 'a number';
        return {
          ok: false,
          what: `'${shorten(text)}' is not ${kind} from ${least} to ${most}`,
          instead: null,
        };
      },
      { example },
    ),
    jsonSchema: { type: whole ? 'integer' : 'number', minimum: least, maximum: most },
  };
}

/** The same shape with a further rule on the understood value: a text says what is wrong, null is right. */
export function ruled<T>(
  parse: (text: string) => Parsed<T>,
  rule: (value: T) => { readonly what: string; readonly instead: string | null } | null,
): (text: string) => Parsed<T> {
  return (text) => {
    const parsed = parse(text);
    if (!parsed.ok) return parsed;
    const broken = rule(parsed.value);
    return broken === null
      ? parsed
      : { ok: false, what: `'${shorten(text)}' ${broken.what}`, instead: broken.instead };
  };
}

export function isEmptyValue(node: unknown): boolean {
  return isScalar(node) && node.value === '' && node.type === 'PLAIN' && !isAlias(node);
}
