/**
 * Patterns for relative paths: text taken letter by letter, `<any>` for any text within one name (none too), `/`
 * between a subfolder and what lies in it. `<machine>` and `<point>` are filled with ids before a path is compared.
 * A path fits only as a whole.
 */
export type PatternPart = { readonly kind: 'text'; readonly text: string } | { readonly kind: Placeholder };

export type Placeholder = 'any' | 'machine' | 'point';

/** What is wrong with a pattern and what would be right. */
export interface PatternProblem {
  readonly wrong: string;
  readonly remedy: string;
}

const placeholders: readonly string[] = ['any', 'machine', 'point'];
const longestPattern = 1000;

/** Parts of a pattern as written, or why it is none. */
export function parsePattern(pattern: string): readonly PatternPart[] | PatternProblem {
  const problem = wholeProblem(pattern);
  if (problem !== null) return problem;
  const parts: PatternPart[] = [];
  for (const piece of pattern.split(/(<[^<>]*>)/)) {
    if (piece === '') continue;
    if (!piece.startsWith('<') || !piece.endsWith('>')) {
      if (/[<>]/.test(piece)) {
        return {
          wrong: `"${piece}" holds a < or > that belongs to no placeholder`,
          remedy: 'write <any>, <machine> or <point>; a file name with < or > needs files_regex',
        };
      }
      parts.push({ kind: 'text', text: piece });
      continue;
    }
    const name = piece.slice(1, -1);
    if (!placeholders.includes(name)) return unknownPlaceholder(name);
    parts.push({ kind: name as Placeholder });
  }
  return parts;
}

export function isPatternProblem(answer: object): answer is PatternProblem {
  return 'wrong' in answer;
}

function wholeProblem(pattern: string): PatternProblem | null {
  if (pattern === '')
    return { wrong: 'the pattern is empty', remedy: 'write for example <machine>_<any>.wav' };
  if (pattern.length > longestPattern) {
    return { wrong: `the pattern has ${pattern.length} characters`, remedy: `at most ${longestPattern}` };
  }
  if (pattern.includes('\\')) {
    return { wrong: 'the pattern holds a \\', remedy: 'write / between folders, on every system' };
  }
  if (/\p{Cc}/u.test(pattern)) {
    return { wrong: 'the pattern holds a control character', remedy: 'take it out' };
  }
  const names = pattern.split('/');
  if (names[0] === '') {
    return {
      wrong: 'the pattern begins with /',
      remedy: 'write it relative to the drop folder, without the first /',
    };
  }
  if (names.includes('') || names.includes('.') || names.includes('..')) {
    return { wrong: 'the pattern holds an empty name, . or ..', remedy: 'name each folder between two /' };
  }
  return null;
}

function unknownPlaceholder(name: string): PatternProblem {
  const wrong = `<${name}> is no placeholder here`;
  if (['year', 'month', 'day', 'hour', 'minute', 'second'].includes(name)) {
    return { wrong, remedy: 'write <any> here and the date in start_in_name' };
  }
  return { wrong, remedy: 'the placeholders are <any>, <machine> and <point>' };
}

/** The pattern as written with the two ids in place of their placeholders; `<any>` stays. */
export function fillPattern(parts: readonly PatternPart[], machineId: string, pointId: string): string {
  return parts
    .map((part) => {
      if (part.kind === 'text') return part.text;
      if (part.kind === 'any') return '<any>';
      return part.kind === 'machine' ? machineId : pointId;
    })
    .join('');
}

/**
 * A test for paths from a filled pattern. Takes time in proportion to path and pattern: within one name the fixed
 * pieces are found in order, each as early as it can be, which finds a fit whenever there is one.
 */
export function pathTest(filled: string): (path: string) => boolean {
  const names = filled.split('/').map((name) => name.split('<any>'));
  return (path) => {
    const given = path.split('/');
    return given.length === names.length && given.every((name, n) => nameFits(name, names[n]));
  };
}

function nameFits(name: string, pieces: readonly string[]): boolean {
  const first = pieces[0];
  const last = pieces[pieces.length - 1];
  if (pieces.length === 1) return name === first;
  if (name.length < first.length + last.length || !name.startsWith(first) || !name.endsWith(last))
    return false;
  const end = name.length - last.length;
  let at = first.length;
  for (let n = 1; n < pieces.length - 1; n++) {
    const found = name.indexOf(pieces[n], at);
    if (found < 0 || found + pieces[n].length > end) return false;
    at = found + pieces[n].length;
  }
  return true;
}

/**
 * Fewest letters to change, add or drop to make the path fit the filled pattern, and the place in the path (from 0)
 * up to which it fits; `Infinity` for absurdly long ones.
 */
export function patternDistance(path: string, filled: string): { distance: number; fitsUpTo: number } {
  const tokens = filled
    .split(/(<any>)/)
    .flatMap((piece) => (piece === '<any>' ? [piece] : Array.from(piece)));
  const letters = Array.from(path);
  if (tokens.length * letters.length > 1e6) return { distance: Number.POSITIVE_INFINITY, fitsUpTo: 0 };
  // costs[p]: from the first `n` letters to the first `p` tokens.
  let costs = [0];
  for (const token of tokens) costs.push((costs.at(-1) as number) + (token === '<any>' ? 0 : 1));
  let fitsUpTo = 0;
  for (let n = 1; n <= letters.length; n++) {
    const next = [n];
    for (let p = 1; p <= tokens.length; p++) {
      next.push(
        tokens[p - 1] === '<any>'
          ? Math.min(next[p - 1], letters[n - 1] === '/' ? costs[p] + 1 : costs[p])
          : Math.min(
              next[p - 1] + 1,
              costs[p] + 1,
              costs[p - 1] + (tokens[p - 1] === letters[n - 1] ? 0 : 1),
            ),
      );
    }
    costs = next;
    if (fitsUpTo === n - 1 && costs.includes(0)) fitsUpTo = n;
  }
  return { distance: costs[tokens.length], fitsUpTo };
}
