/**
 * Eigenvalues of a real symmetric matrix, ascending. `matrix` holds n rows of n values and is overwritten.
 *
 * Householder's reduction to three diagonals, then implicit QL steps (Wilkinson & Reinsch 1971, contributions II/2
 * and II/4; values only). Absolute error a few 1e-15 of the largest eigenvalue. About 4/3 n³ operations.
 * Checked: the n x n matrix with 2 on and -1 beside the diagonal has 2 - 2 cos(k pi / (n + 1)).
 */
export function symmetricEigenvalues(matrix: Float64Array, n: number): Float64Array {
  const diagonal = new Float64Array(n);
  const beside = new Float64Array(n);
  reduceToThreeDiagonals(matrix, n, diagonal, beside);
  solveThreeDiagonals(diagonal, beside, n);
  return diagonal.sort();
}

/** Eigenvalues, ascending, of the symmetric Toeplitz matrix R[i][j] = entries[|i - j|], zero past the entries' end. */
export function toeplitzEigenvalues(entries: ArrayLike<number>, n: number): Float64Array {
  const at = (m: number): number => (m < entries.length ? entries[m] : 0);
  // Seen from its middle the matrix is symmetric, so it falls into two of half the size, for even and odd vectors
  // (Cantoni & Butler 1976): a quarter of the work.
  const half = Math.floor(n / 2);
  const odd = n % 2;
  const evenSize = half + odd;
  const even = new Float64Array(evenSize * evenSize);
  const uneven = new Float64Array(half * half);
  for (let i = 0; i < half; i++) {
    for (let j = 0; j < half; j++) {
      const direct = at(Math.abs(i - j));
      const mirrored = at(n - 1 - i - j);
      even[i * evenSize + j] = direct + mirrored;
      uneven[i * half + j] = direct - mirrored;
    }
    if (odd === 1) {
      const toMiddle = Math.SQRT2 * at(half - i);
      even[i * evenSize + half] = toMiddle;
      even[half * evenSize + i] = toMiddle;
    }
  }
  if (odd === 1) even[half * evenSize + half] = at(0);
  const all = new Float64Array(n);
  all.set(symmetricEigenvalues(even, evenSize), 0);
  all.set(symmetricEigenvalues(uneven, half), evenSize);
  return all.sort();
}

function reduceToThreeDiagonals(
  a: Float64Array,
  n: number,
  diagonal: Float64Array,
  beside: Float64Array,
): void {
  const p = new Float64Array(n);
  for (let i = n - 1; i >= 1; i--) {
    const row = a.subarray(i * n, i * n + i);
    let norm = 0;
    for (let k = 0; k < i; k++) norm += row[k] * row[k];
    norm = Math.sqrt(norm);
    let rest = 0;
    for (let k = 0; k < i - 1; k++) rest += Math.abs(row[k]);
    if (rest === 0) {
      beside[i] = row[i - 1];
      continue;
    }
    const pivot = row[i - 1];
    const target = pivot > 0 ? -norm : norm;
    beside[i] = target;
    // Reflection I - u u' / h with u the row less its image.
    row[i - 1] = pivot - target;
    const h = norm * norm - pivot * target;
    let overlap = 0;
    for (let j = 0; j < i; j++) {
      let sum = 0;
      for (let k = 0; k <= j; k++) sum += a[j * n + k] * row[k];
      for (let k = j + 1; k < i; k++) sum += a[k * n + j] * row[k];
      p[j] = sum / h;
      overlap += p[j] * row[j];
    }
    const half = overlap / (2 * h);
    for (let j = 0; j < i; j++) p[j] -= half * row[j];
    for (let j = 0; j < i; j++) {
      for (let k = 0; k <= j; k++) a[j * n + k] -= row[j] * p[k] + p[j] * row[k];
    }
  }
  for (let i = 0; i < n; i++) diagonal[i] = a[i * n + i];
}

function solveThreeDiagonals(d: Float64Array, e: Float64Array, n: number): void {
  for (let i = 1; i < n; i++) e[i - 1] = e[i];
  if (n > 0) e[n - 1] = 0;
  for (let l = 0; l < n; l++) {
    for (let iteration = 0; ; iteration++) {
      let m = l;
      while (m < n - 1 && Math.abs(e[m]) > 2 ** -53 * (Math.abs(d[m]) + Math.abs(d[m + 1]))) m++;
      if (m === l) break;
      if (iteration === 60)
        throw new Error('eigenvalues do not settle: the matrix holds values that are not finite');
      let g = (d[l + 1] - d[l]) / (2 * e[l]);
      let r = Math.hypot(g, 1);
      g = d[m] - d[l] + e[l] / (g + (g >= 0 ? r : -r));
      let s = 1;
      let c = 1;
      let p = 0;
      let i = m - 1;
      for (; i >= l; i--) {
        const f = s * e[i];
        const b = c * e[i];
        r = Math.hypot(f, g);
        e[i + 1] = r;
        if (r === 0) {
          d[i + 1] -= p;
          e[m] = 0;
          break;
        }
        s = f / r;
        c = g / r;
        g = d[i + 1] - p;
        r = (d[i] - g) * s + 2 * c * b;
        p = s * r;
        d[i + 1] = g + p;
        g = c * r - b;
      }
      if (r === 0 && i >= l) continue;
      d[l] -= p;
      e[l] = g;
      e[m] = 0;
    }
  }
}
