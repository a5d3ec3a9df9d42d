import { type Document, isAlias, isNode, type Node, parseDocument, visit } from 'yaml';
import { applyRepairs, lineRepairs, parsedRepairs, type Repair } from './repairs.ts';
import { SiteText, type Span } from './site-text.ts';

/** Bounds of a site file; a real one of 500 points stays below a tenth of each. */
export const mostCharacters = 1_048_576;
const mostLines = 50_000;
const longestLine = 4000;
/** Opened one in the other, on one line that is no comment; the parser's work grows with their square. */
const nestedDeeply = /^[^#]*?(?:[[{]\s*|[-?:]\s){31}/;
const mostAliases = 100;
/** Repairs are tried so often, and only while a file has no more errors than a person makes. */
const mostRounds = 5;
const mostErrors = 500;

/** The parsed file: `source` is the text after repairs (same lines), `target` resolves aliases. */
export interface SiteYaml {
  readonly source: SiteText;
  readonly root: Node | null;
  readonly target: ReadonlyMap<Node, Node>;
}

/**
 * Text to nodes with every scalar as written (no numbers, no dates, no booleans). Problems of notation are put into
 * `original`; `root` is null where no reading is possible. No custom tags, no more than 100 aliases, one document.
 */
export function readYaml(original: SiteText): SiteYaml {
  let source = original;
  if (tooLarge(original) || controlCharacters(original)) return { source, root: null, target: new Map() };
  let repairs = lineRepairs(source);
  for (let round = 0; ; round++) {
    if (repairs.length > 0) {
      for (const repair of repairs) tell(original, source, repair);
      source = new SiteText(applyRepairs(source.text, repairs));
    }
    const document = parse(source.text);
    repairs =
      round < mostRounds && document.errors.length <= mostErrors ? parsedRepairs(source, document) : [];
    if (repairs.length > 0) continue;
    const sound = tellSyntax(original, source, document);
    const target = aliasTargets(original, source, document);
    return { source, root: sound && target !== null ? document.contents : null, target: target ?? new Map() };
  }
}

function parse(text: string): Document {
  // Duplicate keys are found by the schema's own reading, with the line of the first and in linear time.
  return parseDocument(text, {
    schema: 'failsafe',
    version: '1.2',
    uniqueKeys: false,
    merge: false,
    strict: true,
    prettyErrors: false,
    logLevel: 'error',
  });
}

function tooLarge(original: SiteText): boolean {
  const top = { from: 0, to: 0 };
  const share = 'share bands and limits by machine_types';
  if (original.text.length > mostCharacters)
    original.problem(top, 'the site file is larger than 1 MB', share);
  else if (original.lines > mostLines)
    original.problem(top, `the site file has more than ${mostLines} lines`, share);
  else {
    for (let number = 1; number <= original.lines; number++) {
      const at = original.lineStart(number);
      const line = original.line(number);
      const here = { from: at, to: at };
      if (line.length > longestLine) {
        original.problem(here, `the line has more than ${longestLine} characters`, 'break it into several');
      } else if (nestedDeeply.test(line)) {
        original.problem(
          here,
          'the line opens more than 30 lists or groups',
          'a site has five levels at most',
        );
      }
    }
  }
  return original.problems().length > 0;
}

function controlCharacters(original: SiteText): boolean {
  const found = /[\u0000-\u0008\u000b\u000c\u000e-\u001f\u007f]/.exec(original.text);
  if (found === null) return false;
  const code = found[0].charCodeAt(0).toString(16).padStart(2, '0');
  const here = { from: found.index, to: found.index + 1 };
  original.problem(
    here,
    `a control character (0x${code}) stands here`,
    'remove it, or save the file as UTF-8 text',
  );
  return true;
}

/** Repaired texts keep their lines; a column in a repaired line may be off by what the repair added. */
export function inOriginal(original: SiteText, source: SiteText, offset: number): number {
  const { line, column } = source.place(offset);
  return original.lineStart(line) + Math.min(column - 1, original.line(line).length);
}

function tell(original: SiteText, source: SiteText, repair: Repair): void {
  const from = inOriginal(original, source, repair.from);
  const right = repair.right ?? `write: ${source.corrected(repair, repair.replacement)}`;
  original.problem({ from, to: from }, repair.what, right);
}

const plainWords: Readonly<Record<string, readonly [string, string]>> = {
  BAD_INDENT: [
    'this line stands in a column that fits neither the line above nor its list, or a bracket is not closed',
    'begin entries of one level in the same column and close every { and [',
  ],
  MULTILINE_IMPLICIT_KEY: [
    'this line is indented deeper than a line above that already has a value',
    'begin it in the column of the key above',
  ],
  BLOCK_AS_IMPLICIT_KEY: [
    'the value of this key goes on with another key',
    'begin the next key on a line of its own, or put the value in single quotes',
  ],
  MULTIPLE_DOCS: ["a line '---' begins a second document", 'remove the line: a site is one document'],
  UNEXPECTED_TOKEN: [
    'this does not belong here',
    'put the value in single quotes, or remove what follows it',
  ],
  BAD_SCALAR_START: ['a value cannot begin with this character', 'put the value in single quotes'],
  TAB_AS_INDENT: ['a tab stands where only spaces may', 'write spaces'],
};

/** False where something is left that no repair covers. */
function tellSyntax(original: SiteText, source: SiteText, document: Document): boolean {
  const lastLines = new Map<string, number>();
  for (const { code, pos, message } of document.errors) {
    const from = inOriginal(original, source, pos[0]);
    // One wrong column makes the lines that follow it wrong too: of such a run the first is told.
    const { line } = source.place(pos[0]);
    const last = lastLines.get(code);
    lastLines.set(code, line);
    if (last !== undefined && line - last <= 4) continue;
    const [what, right] = plainWords[code] ?? [
      lowerFirst(message.replace(/\s+/g, ' ').replace(/ at line \d+.*$/, '')),
      'compare with config/site.example.yaml',
    ];
    const missing = code === 'MISSING_CHAR' ? missingChar(message) : null;
    original.problem({ from, to: from }, missing?.[0] ?? what, missing?.[1] ?? right, code);
  }
  return document.errors.length === 0;
}

function missingChar(message: string): readonly [string, string] {
  if (/quote/.test(message)) return ['a quoted text is not closed', 'end it with the quote it began with'];
  if (/Implicit map key/.test(message)) return ["this line has no ':'", 'write: key: value'];
  if (/sequence|Sequence/.test(message))
    return ["an entry of this list lacks its '- '", "begin each entry with '- '"];
  return ['something is missing here', 'close every { and [, and put a space after every colon'];
}

function lowerFirst(text: string): string {
  return text.charAt(0).toLowerCase() + text.slice(1);
}

function aliasRemedy(source: SiteText, node: Node): string {
  const [from, to] = node.range ?? [0, 0];
  return `write: ${source.corrected({ from, to }, `'${source.text.slice(from, to)}'`)}`;
}

function tellTag(original: SiteText, source: SiteText, offset: number): void {
  const begin = source.text.lastIndexOf('!', offset);
  const tag: Span = { from: begin < 0 ? offset : begin, to: offset };
  const from = inOriginal(original, source, tag.from);
  const written = source.text.slice(tag.from, tag.to).trim().slice(0, 40);
  original.problem(
    { from, to: from },
    `the tag ${written} is not allowed`,
    `write: ${source.corrected(tag, '')}`,
  );
}

/** Each alias with the node it stands for, found in one pass; null where they are unknown or too many. */
function aliasTargets(
  original: SiteText,
  source: SiteText,
  document: Document,
): ReadonlyMap<Node, Node> | null {
  const anchors = new Map<string, Node>();
  const target = new Map<Node, Node>();
  let sound = true;
  const refuse = (node: Node, what: string, right: string, once?: string) => {
    const from = inOriginal(original, source, node.range?.[0] ?? 0);
    original.problem({ from, to: from }, what, right, once);
    sound = false;
  };
  visit(document, {
    Node: (_, node) => {
      if (!isNode(node)) return undefined;
      if (isAlias(node)) {
        const known = anchors.get(node.source);
        if (known === undefined)
          refuse(node, `'*${node.source}' stands for nothing above it`, aliasRemedy(source, node));
        else if (target.size < mostAliases) target.set(node, known);
        else {
          refuse(node, `more than ${mostAliases} aliases`, 'share bands and limits by machine_types');
          return visit.BREAK;
        }
        return undefined;
      }
      if (node.anchor) anchors.set(node.anchor, node);
      if (node.tag !== undefined) tellTag(original, source, node.range?.[0] ?? 0);
      return undefined;
    },
  });
  return sound ? target : null;
}
