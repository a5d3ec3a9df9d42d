/** Levenshtein distance, given up (returned as `most` + 1) once it must exceed `most`. */
function editDistance(a: string, b: string, most: number): number {
  if (Math.abs(a.length - b.length) > most) return most + 1;
  let row = Array.from({ length: b.length + 1 }, (_, j) => j);
  for (let i = 1; i <= a.length; i++) {
    const next = [i];
    for (let j = 1; j <= b.length; j++) {
      next.push(Math.min(row[j] + 1, next[j - 1] + 1, row[j - 1] + (a[i - 1] === b[j - 1] ? 0 : 1)));
    }
    if (Math.min(...next) > most) return most + 1;
    row = next;
  }
  return row[b.length];
}

/**
 * The known word that a mistyped one most likely meant, or null where none is near: at most a third of its letters
 * differ, case, spaces, hyphens and underscores aside. Words over 60 letters are not compared.
 */
export function nearest(word: string, known: Iterable<string>): string | null {
  const wanted = plain(word);
  if (wanted.length > 60) return null;
  let best: string | null = null;
  let least = Math.max(1, Math.floor(wanted.length / 3)) + 1;
  for (const candidate of known) {
    const distance = editDistance(wanted, plain(candidate), least - 1);
    if (distance < least) [best, least] = [candidate, distance];
  }
  return best;
}

function plain(word: string): string {
  return word.toLowerCase().replace(/[\s_-]/g, '');
}
