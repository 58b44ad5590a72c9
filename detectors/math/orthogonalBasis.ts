/**
 * Least squares by Householder reflections (Golub 1965, Numer. Math. 7, 206) on columns held apart, so that a fixed part
 * of a design is reduced once and many further columns are sent through the same reflections.
 */
export interface OrthogonalBasis {
  /** Rows of every column. */
  readonly rows: number;
  /** How many independent columns were found; further columns keep their own part in entries `rank …`. */
  rank: number;
  /** For each reduced column: its place among the independent ones, or −1 when it depends on earlier columns. */
  readonly places: number[];
  readonly reflectors: Float64Array[];
  readonly scales: number[];
}

export function emptyBasis(rows: number): OrthogonalBasis {
  return { rows, rank: 0, places: [], reflectors: [], scales: [] };
}

/** Sends a column through the reflections, in place. */
export function applyBasis(basis: OrthogonalBasis, column: Float64Array): void {
  const { rows, reflectors, scales, rank } = basis;
  for (let r = 0; r < rank; r++) {
    const reflector = reflectors[r]!;
    let dot = 0;
    for (let i = r; i < rows; i++) dot += reflector[i]! * column[i]!;
    dot *= scales[r]!;
    for (let i = r; i < rows; i++) column[i] = column[i]! - dot * reflector[i]!;
  }
}

/**
 * Adds a column to the basis. It becomes its column of R, in place. A column whose new part is below `tolerance` of its
 * length depends on earlier ones and is left out.
 */
export function extendBasis(basis: OrthogonalBasis, column: Float64Array, tolerance = 1e-10): boolean {
  const { rows, rank } = basis;
  const length = norm(column, 0, rows);
  applyBasis(basis, column);
  const rest = norm(column, rank, rows);
  if (!(rest > tolerance * length)) {
    for (let i = rank; i < rows; i++) column[i] = 0;
    basis.places.push(-1);
    return false;
  }
  const reflector = new Float64Array(rows);
  for (let i = rank; i < rows; i++) reflector[i] = column[i]!;
  const alpha = column[rank]! > 0 ? -rest : rest;
  reflector[rank] = reflector[rank]! - alpha;
  basis.scales.push(1 / (rest * (rest + Math.abs(column[rank]!))));
  basis.reflectors.push(reflector);
  column[rank] = alpha;
  for (let i = rank + 1; i < rows; i++) column[i] = 0;
  basis.places.push(rank);
  basis.rank = rank + 1;
  return true;
}

export interface LeastSquaresFit {
  /** Dependent columns get 0. */
  readonly solution: Float64Array;
  /** Columns × columns, row-major, for unit variance of each row; rows of dependent columns are 0. */
  readonly covariance: Float64Array;
  readonly rank: number;
  readonly residualSumOfSquares: number;
  /** ln det(XᵀX) over the independent columns. */
  readonly logDeterminant: number;
}

/** Minimises |y − Σ xⱼ columnⱼ|². The arguments are not changed. */
export function leastSquares(columns: readonly Float64Array[], y: Float64Array): LeastSquaresFit {
  const basis = emptyBasis(y.length);
  const reduced = columns.map((column) => Float64Array.from(column));
  for (const column of reduced) extendBasis(basis, column);
  const target = Float64Array.from(y);
  applyBasis(basis, target);
  const { rank, places } = basis;
  const independent = columns.flatMap((_, j) => (places[j]! >= 0 ? [j] : []));
  const p = columns.length;
  const solution = new Float64Array(p);
  const covariance = new Float64Array(p * p);
  const inverse = inverseOfUpper(
    independent.map((j) => reduced[j]!),
    rank,
  );
  let logDeterminant = 0;
  for (let a = 0; a < rank; a++) {
    for (let k = a; k < rank; k++) solution[independent[a]!]! += inverse[a * rank + k]! * target[k]!;
    for (let b = 0; b < rank; b++) {
      let sum = 0;
      for (let k = Math.max(a, b); k < rank; k++) sum += inverse[a * rank + k]! * inverse[b * rank + k]!;
      covariance[independent[a]! * p + independent[b]!] = sum;
    }
    logDeterminant -= 2 * Math.log(Math.abs(inverse[a * rank + a]!));
  }
  const rest = norm(target, rank, y.length);
  return { solution, covariance, rank, residualSumOfSquares: rest * rest, logDeterminant };
}

/** Inverse of the upper triangular R whose columns are given, row-major. */
function inverseOfUpper(columns: readonly Float64Array[], n: number): Float64Array {
  const inverse = new Float64Array(n * n);
  for (let j = 0; j < n; j++) {
    inverse[j * n + j] = 1 / columns[j]![j]!;
    for (let i = j - 1; i >= 0; i--) {
      let sum = 0;
      for (let k = i + 1; k <= j; k++) sum += columns[k]![i]! * inverse[k * n + j]!;
      inverse[i * n + j] = -sum / columns[i]![i]!;
    }
  }
  return inverse;
}

function norm(column: Float64Array, from: number, to: number): number {
  let sum = 0;
  for (let i = from; i < to; i++) sum += column[i]! * column[i]!;
  return Math.sqrt(sum);
}
