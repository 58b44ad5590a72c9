/** Cholesky factor and triangular solves on row-major n×n Float64Arrays; for the small systems of the detectors. */

/**
 * Overwrites the lower triangle of the symmetric `a` with L, L Lᵀ = a; the upper triangle is not read or written.
 * A pivot below `tolerance` times its diagonal entry means that this direction is not determined: its row and column of
 * L become 0 (the pivot too) and it does not count.
 * @returns the rank; n when `a` is positive definite.
 */
export function choleskyFactor(a: Float64Array, n: number, tolerance = 1e-13): number {
  let rank = 0;
  for (let j = 0; j < n; j++) {
    const diagonal = a[j * n + j]!;
    let pivot = diagonal;
    for (let k = 0; k < j; k++) pivot -= a[j * n + k]! * a[j * n + k]!;
    if (!(pivot > tolerance * diagonal)) {
      for (let i = j; i < n; i++) a[i * n + j] = 0;
      continue;
    }
    rank += 1;
    const root = Math.sqrt(pivot);
    a[j * n + j] = root;
    for (let i = j + 1; i < n; i++) {
      let sum = a[i * n + j]!;
      for (let k = 0; k < j; k++) sum -= a[i * n + k]! * a[j * n + k]!;
      a[i * n + j] = sum / root;
    }
  }
  return rank;
}

/** Solves L x = b in place. Undetermined directions (zero pivots) get 0. */
export function solveLower(l: Float64Array, n: number, b: Float64Array): void {
  for (let i = 0; i < n; i++) {
    let sum = b[i]!;
    for (let k = 0; k < i; k++) sum -= l[i * n + k]! * b[k]!;
    const pivot = l[i * n + i]!;
    b[i] = pivot === 0 ? 0 : sum / pivot;
  }
}

/** Solves Lᵀ x = b in place. Undetermined directions get 0. */
export function solveLowerTransposed(l: Float64Array, n: number, b: Float64Array): void {
  for (let i = n - 1; i >= 0; i--) {
    let sum = b[i]!;
    for (let k = i + 1; k < n; k++) sum -= l[k * n + i]! * b[k]!;
    const pivot = l[i * n + i]!;
    b[i] = pivot === 0 ? 0 : sum / pivot;
  }
}

/** ln det of L Lᵀ over the determined directions. */
export function logDeterminant(l: Float64Array, n: number): number {
  let sum = 0;
  for (let i = 0; i < n; i++) {
    const pivot = l[i * n + i]!;
    if (pivot > 0) sum += 2 * Math.log(pivot);
  }
  return sum;
}
