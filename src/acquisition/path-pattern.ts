/**
 * Patterns for relative paths, as the site file's check has accepted them: text taken letter by letter, `<any>` for
 * any text within one name (none too), `/` between a subfolder and what lies in it. A path fits only as a whole.
 */

/** The pattern with the two ids in place of `<machine>` and `<point>`; `<any>` stays. */
export function fillPattern(pattern: string, machineId: string, pointId: string): string {
  return pattern.replaceAll('<machine>', () => machineId).replaceAll('<point>', () => pointId);
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
