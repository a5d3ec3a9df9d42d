import { isAlias, isSeq, type Node } from 'yaml';
import type { SiteText, Span } from './site-text.ts';
import { inOriginal, type SiteYaml } from './site-yaml.ts';

/** Nodes looked at in one file, those reached again through aliases included: what bounds the work. */
const mostNodes = 300_000;

/** One pass over a site file: resolves aliases, keeps the bound on work, and tells problems at their place. */
export class Reading {
  readonly text: string;
  /** Where a key may stand, for 'belongs under'; set by the schema. */
  readonly homes: ReadonlyMap<string, readonly string[]>;
  readonly #original: SiteText;
  readonly #yaml: SiteYaml;
  #nodes = 0;

  constructor(original: SiteText, yaml: SiteYaml, homes: ReadonlyMap<string, readonly string[]>) {
    this.text = yaml.source.text;
    this.homes = homes;
    this.#original = original;
    this.#yaml = yaml;
  }

  resolve(node: Node): Node {
    return isAlias(node) ? (this.#yaml.target.get(node) ?? node) : node;
  }

  isList(node: Node): boolean {
    return isSeq(this.resolve(node));
  }

  /** Counts one node; false once the file asks for more work than any real site would. */
  enter(at: Span): boolean {
    this.#nodes++;
    if (this.#nodes === mostNodes + 1) {
      this.problem(at, 'the site file holds too much, aliases unrolled', 'use fewer aliases', 'too much');
    }
    return this.#nodes <= mostNodes;
  }

  /** Problems with the same `once` at one place are told once. */
  problem(at: Span, what: string, right: string, once?: string): void {
    this.#original.problem(this.#there(at), what, right, once);
  }

  warn(at: Span, text: string, once?: string): void {
    this.#original.warn(this.#there(at), text, once);
  }

  /** `write: ` and the line with the span replaced. */
  write(at: Span, replacement: string): string {
    return `write: ${this.#yaml.source.corrected(at, replacement)}`;
  }

  lineOf(at: Span): number {
    return this.#yaml.source.place(at.from).line;
  }

  #there(at: Span): Span {
    const from = inOriginal(this.#original, this.#yaml.source, at.from);
    return { from, to: from };
  }
}
