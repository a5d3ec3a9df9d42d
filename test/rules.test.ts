/**
 * The house rules as a test: which block may import which, what the pure core may not touch, how long a file and a
 * function may be, and that nothing lies about unused. A message names the place and the remedy.
 */
import { readdirSync, readFileSync } from 'node:fs';
import { join, relative, resolve } from 'node:path';
import { parseAst } from 'vite';
import { describe, expect, it } from 'vitest';

const root = resolve(import.meta.dirname, '..');
const sourceRoot = join(root, 'src');

type Use = 'all' | 'types';
const blocks = ['acquisition', 'manipulation', 'detection', 'assessment', 'prognosis', 'advisory'] as const;
const every = (use: Use, names: readonly string[]): Record<string, Use> =>
  Object.fromEntries(names.map((name) => [name, use]));

/** Row may import column; the folders are the blocks of ISO 13374-1 in the order in which data meets them. */
const mayImport: Record<string, Record<string, Use>> = {
  signal: {},
  config: { signal: 'all' },
  acquisition: { config: 'all', signal: 'all' },
  manipulation: { acquisition: 'types', config: 'all', signal: 'all' },
  detection: { manipulation: 'types', acquisition: 'types', config: 'all', signal: 'all' },
  assessment: { manipulation: 'types', config: 'all', signal: 'all' },
  prognosis: { signal: 'all' },
  advisory: { ...every('types', blocks), detection: 'all', config: 'all', signal: 'all' },
  store: { ...every('types', blocks), config: 'types' },
  service: every('all', ['signal', 'config', ...blocks, 'store', 'web']),
  web: { store: 'all', advisory: 'all', config: 'all' },
  cli: every('all', ['signal', 'config', ...blocks, 'store', 'service', 'web']),
};

/** Files outside the shell that may touch node: modules, with the reason. node:crypto hashes are pure. */
const touchesOutside: Record<string, string> = {
  'config/load.ts': 'reads the site file',
  'config/write-schema.ts': 'writes the JSON Schema, by hand',
  'acquisition/drop-folder.ts': 'looks at the drop folder',
  'acquisition/sweep.ts': 'walks through the drop folder',
  'acquisition/filing.ts': 'moves recordings',
  'acquisition/filing-disk.ts': 'copies recordings across file systems',
  'manipulation/pool.ts': 'runs worker threads',
  'advisory/mailer.ts': 'talks to the mail server',
};
const shell = ['store', 'service', 'web', 'cli'];

const pureFolders = [
  'signal',
  'detection',
  'assessment',
  'prognosis',
  'manipulation',
  'advisory',
  'acquisition',
  'config',
];
const bannedInPureCode: readonly [RegExp, string][] = [
  [/\bDate\.now\s*\(/, 'take the time as an argument'],
  [/\bnew Date\s*\(\s*\)/, 'take the time as an argument'],
  [/\bMath\.random\s*\(/, 'take a seeded generator as an argument'],
  [/\bperformance\.now\s*\(/, 'take the monotonic time as an argument'],
  [/\bprocess\.(env|cwd|argv|hrtime)\b/, 'take the setting as an argument'],
  [/\bsetTimeout\s*\(|\bsetInterval\s*\(/, 'waiting belongs to the service'],
];
const bannedEverywhere: readonly [RegExp, string][] = [
  [/\bconsole\.(log|error|warn)\s*\(/, 'use the logger, or write to the stream that the command was given'],
  [/\bas any\b/, 'say what it is'],
  [/@ts-(ignore|nocheck|expect-error)/, 'mend the type'],
  [/\b(TODO|FIXME|XXX)\b/, 'finish it'],
  [/\bor replace\b/i, 'use on conflict do update: replace deletes the row first'],
];

const longestFile = 250;
const longestFunction = 70;
/** Exceptions with their reason; an entry may only shrink. */
const longerFiles: Record<string, { lines: number; reason: string }> = {
  'store/schema.ts': { lines: 320, reason: 'one table type after another, read as a list' },
};
const longerFunctions: Record<string, { lines: number; reason: string }> = {};
/** Entered from outside the import graph. */
const entries = [
  /\.d\.ts$/,
  /^cli\/start\.ts$/,
  /worker\.ts$/,
  /^config\/write-schema\.ts$/,
  /^cli\/commands\//,
];

/** Single functions that may be taken where otherwise only types may, with the reason. */
const singleExceptions: Record<string, string> = {
  'store -> detection/alarm.ts': 'subjectKey is the name under which a row is kept',
};

interface SourceFile {
  readonly path: string;
  readonly folder: string;
  readonly text: string;
  readonly imports: readonly { readonly from: string; readonly typeOnly: boolean }[];
}

function filesUnder(folder: string): string[] {
  return readdirSync(folder, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile() && entry.name.endsWith('.ts'))
    .map((entry) => join(entry.parentPath, entry.name))
    .sort();
}

interface Node {
  readonly type: string;
  readonly start: number;
  readonly end: number;
  readonly [key: string]: unknown;
}

function walk(
  node: unknown,
  visit: (node: Node, parent: Node | null) => void,
  parent: Node | null = null,
): void {
  if (Array.isArray(node)) {
    for (const item of node) walk(item, visit, parent);
    return;
  }
  if (typeof node !== 'object' || node === null || !('type' in node)) return;
  const here = node as Node;
  visit(here, parent);
  for (const [key, value] of Object.entries(here)) {
    if (key !== 'type' && typeof value === 'object' && value !== null) walk(value, visit, here);
  }
}

function parse(text: string): Node {
  return parseAst(text, { lang: 'ts' }) as unknown as Node;
}

function importsOf(program: Node): { from: string; typeOnly: boolean }[] {
  const found: { from: string; typeOnly: boolean }[] = [];
  walk(program, (node) => {
    const source = (node.source as { value?: unknown } | undefined)?.value;
    if (typeof source !== 'string') return;
    const typeOnly = node.importKind === 'type' || node.exportKind === 'type';
    found.push({ from: source, typeOnly });
  });
  return found;
}

const sources: SourceFile[] = filesUnder(sourceRoot).map((file) => {
  const path = relative(sourceRoot, file);
  const text = readFileSync(file, 'utf8');
  return { path, folder: path.split('/')[0] as string, text, imports: importsOf(parse(text)) };
});

/** Code without comments and strings, so that prose about a banned call is no call. */
function codeOnly(text: string): string {
  return text
    .replace(/\/\*[\s\S]*?\*\//g, (comment) => comment.replace(/[^\n]/g, ' '))
    .replace(/(^|[^:'"`\\])\/\/.*$/gm, '$1');
}

function placesOf(pattern: RegExp, text: string): number[] {
  return text.split('\n').flatMap((line, index) => (pattern.test(line) ? [index + 1] : []));
}

const lineOf = (text: string, offset: number): number => text.slice(0, offset).split('\n').length;

describe('the rules of the house', () => {
  it('imports run one way, from the blocks to the shell', () => {
    const wrong: string[] = [];
    for (const source of sources) {
      const row = mayImport[source.folder];
      if (row === undefined) {
        wrong.push(`src/${source.path}: no such room; the folders are ${Object.keys(mayImport).join(', ')}`);
        continue;
      }
      for (const { from, typeOnly } of source.imports) {
        if (!from.startsWith('.')) continue;
        const target = relative(sourceRoot, resolve(sourceRoot, source.path, '..', from)).split(
          '/',
        )[0] as string;
        if (target === source.folder) continue;
        const use = row[target];
        if (use === 'all' || (use === 'types' && typeOnly)) continue;
        const file = relative(sourceRoot, resolve(sourceRoot, source.path, '..', from));
        if (`${source.folder} -> ${file}` in singleExceptions) continue;
        wrong.push(
          `src/${source.path} imports ${from}: ${source.folder} may ${use === 'types' ? 'take only types from' : 'not import'} ${target}`,
        );
      }
    }
    expect(wrong).toEqual([]);
  });

  it('only the shell and a few named files touch the outside', () => {
    const wrong: string[] = [];
    for (const source of sources) {
      if (shell.includes(source.folder) || source.path in touchesOutside) continue;
      for (const { from, typeOnly } of source.imports) {
        if (from.startsWith('node:') && from !== 'node:crypto' && !typeOnly) {
          wrong.push(`src/${source.path} imports ${from}: take bytes, paths or times as arguments`);
        }
      }
    }
    expect(wrong).toEqual([]);
  });

  it('the pure core reads no clock, file, random number or environment', () => {
    const wrong: string[] = [];
    for (const source of sources) {
      const code = codeOnly(source.text);
      const rules = [
        ...bannedEverywhere,
        ...(pureFolders.includes(source.folder) && !(source.path in touchesOutside) ? bannedInPureCode : []),
      ];
      for (const [pattern, instead] of rules) {
        for (const line of placesOf(pattern, code))
          wrong.push(`src/${source.path}:${line}: ${pattern.source}: ${instead}`);
      }
    }
    expect(wrong).toEqual([]);
  });

  it(`no file is longer than ${longestFile} lines, no function longer than ${longestFunction}`, () => {
    const wrong: string[] = [];
    for (const source of sources) {
      const lines = source.text.trimEnd().split('\n').length;
      const allowed = longerFiles[source.path]?.lines ?? longestFile;
      if (lines > allowed)
        wrong.push(`src/${source.path}: ${lines} lines, ${allowed} allowed: split it by subject`);
      walk(parse(source.text), (node, parent) => {
        if (!/^(FunctionDeclaration|FunctionExpression|ArrowFunctionExpression)$/.test(node.type)) return;
        const length = lineOf(source.text, node.end) - lineOf(source.text, node.start) + 1;
        const named = (node.id ?? parent?.key ?? parent?.id) as { name?: string } | null | undefined;
        const name = `${source.path}#${named?.name ?? 'anonymous'}`;
        const most = longerFunctions[name]?.lines ?? longestFunction;
        if (length > most) wrong.push(`src/${name}: ${length} lines, ${most} allowed: name its parts`);
      });
    }
    expect(wrong).toEqual([]);
  });

  it('every file is used', () => {
    const used = new Set(
      sources.flatMap((source) =>
        source.imports
          .filter(({ from }) => from.startsWith('.'))
          .map(({ from }) => relative(sourceRoot, resolve(sourceRoot, source.path, '..', from))),
      ),
    );
    const unused = sources
      .map(({ path }) => path)
      .filter((path) => !used.has(path) && !entries.some((entry) => entry.test(path)));
    expect(unused).toEqual([]);
  });

  it('tests do not sleep, and none is focused or left out silently', () => {
    const wrong: string[] = [];
    for (const file of filesUnder(join(root, 'test'))) {
      if (file === import.meta.filename) continue;
      const code = codeOnly(readFileSync(file, 'utf8'));
      for (const [pattern, instead] of [
        [/\b(it|test|describe)\.(only|skip|todo)\b/, 'run it, or skip loudly with skipIf and a named reason'],
        [/\bsetTimeout\s*\(\s*(resolve|done|r)\b|\bsleep\s*\(/, 'inject the clock or await the event'],
      ] as const) {
        for (const line of placesOf(pattern, code)) wrong.push(`${relative(root, file)}:${line}: ${instead}`);
      }
    }
    expect(wrong).toEqual([]);
  });

  it('a rule that is broken is seen', () => {
    expect(placesOf(bannedInPureCode[0]?.[0] as RegExp, codeOnly('const t = Date.now();'))).toEqual([1]);
    expect(placesOf(bannedInPureCode[0]?.[0] as RegExp, codeOnly('// not Date.now()'))).toEqual([]);
    expect(importsOf(parse("import type { A } from './a.ts'; import { b } from '../b.ts';"))).toEqual([
      { from: './a.ts', typeOnly: true },
      { from: '../b.ts', typeOnly: false },
    ]);
  });
});
