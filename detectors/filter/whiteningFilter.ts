import { SPIN_STATES, type Walks } from './stateSpace.ts';

/**
 * The whitening filter: a Kalman filter over (phase, rate, second rate) and any number of static states (receiver
 * offsets, dispersion), that turns correlated phase deviations into independent innovations.
 *
 * The covariance is held as P = U Uᵀ with U upper triangular, spin states first: P cannot lose symmetry or positivity
 * over any number of steps, and the time step touches the upper left 3×3 of U alone. Measurement update: Carlson 1973
 * (AIAA J. 11, 1259). Time update: Householder reflections.
 *
 * Several columns go through the same gains: column 0 is the data, any others are the signatures of unit parameters, so
 * that least squares on the whitened columns is generalised least squares on the raw ones (Rosenberg 1973; de Jong 1991).
 */
export interface WhiteningFilter {
  /** 3 + static states. */
  readonly size: number;
  readonly columns: number;
  /** columns × size: the estimate of the state for each column. */
  readonly means: Float64Array;
  /** size × size, row-major, upper triangular. */
  readonly factor: Float64Array;
  /** Set by `expectArrival`: expected value of each column, its variance, and Uᵀ h. */
  readonly expected: Float64Array;
  expectedVariance: number;
  readonly projection: Float64Array;
  /** Set by `absorbArrival`: gain, innovation of each column (not yet divided by its deviation), its variance. */
  readonly gain: Float64Array;
  readonly innovations: Float64Array;
  innovationVariance: number;
}

/** @param priorSd one per state; 0 means exactly known (as when the start is a signature of its own). */
export function createWhiteningFilter(priorSd: ArrayLike<number>, columns = 1): WhiteningFilter {
  const size = priorSd.length;
  const factor = new Float64Array(size * size);
  for (let i = 0; i < size; i++) factor[i * size + i] = priorSd[i]!;
  return {
    size,
    columns,
    means: new Float64Array(columns * size),
    factor,
    expected: new Float64Array(columns),
    expectedVariance: 0,
    projection: new Float64Array(size),
    gain: new Float64Array(size),
    innovations: new Float64Array(columns),
    innovationVariance: 0,
  };
}

/** Starts the filter anew: no knowledge but the prior. */
export function setPrior(filter: WhiteningFilter, priorSd: ArrayLike<number>): void {
  filter.means.fill(0);
  filter.factor.fill(0);
  for (let i = 0; i < filter.size; i++) filter.factor[i * filter.size + i] = priorSd[i]!;
}

/** Moves the state over a gap of `deltaDays` ≥ 0. */
export function predict(filter: WhiteningFilter, deltaDays: number, walks: Walks): void {
  if (deltaDays === 0) return;
  const { size, columns, means, factor } = filter;
  const half = 0.5 * deltaDays * deltaDays;
  for (let c = 0; c < columns; c++) {
    const at = c * size;
    means[at] = means[at]! + deltaDays * means[at + 1]! + half * means[at + 2]!;
    means[at + 1] = means[at + 1]! + deltaDays * means[at + 2]!;
  }
  for (let j = SPIN_STATES; j < size; j++) {
    const rate = factor[size + j]!;
    const second = factor[2 * size + j]!;
    factor[j] = factor[j]! + deltaDays * rate + half * second;
    factor[size + j] = rate + deltaDays * second;
  }
  predictSpinFactor(factor, size, deltaDays, walks);
}

/**
 * The upper left 3×3 of U becomes an upper triangular factor of F U Uᵀ Fᵀ + Q. With Q = G Gᵀ, G upper triangular too,
 * Householder reflections from the last row up gather each row of [F U, G] into its diagonal column. Written out in
 * scalars because everything spends its time here.
 */
function predictSpinFactor(factor: Float64Array, size: number, t: number, walks: Walks): void {
  const { phaseWalk: q1, frequencyWalk: q2, torqueWalk: q3 } = walks;
  const t2 = t * t;
  // F U
  let u11 = factor[size + 1]!;
  let u12 = factor[size + 2]!;
  let u22 = factor[2 * size + 2]!;
  let u00 = factor[0]!;
  let u01 = factor[1]! + t * u11;
  let u02 = factor[2]! + t * u12 + 0.5 * t2 * u22;
  u12 += t * u22;
  // G, from the entries of Q in `writeProcessNoise`
  const g22 = Math.sqrt(q3 * t);
  let g12 = 0.5 * t * g22;
  let g02 = (t2 * g22) / 6;
  const g11 = Math.sqrt(t * (q2 + (q3 * t2) / 12));
  let g01 = g11 > 0 ? (0.5 * t2 * (q2 + (q3 * t2) / 12)) / g11 : 0;
  const g00 = Math.sqrt(t * (q1 + (t2 * (q2 + (q3 * t2) / 60)) / 12));
  if (g22 > 0) {
    // Row 2 of [U G] is (u22, g22) in columns 2 and 5.
    const norm = Math.sqrt(u22 * u22 + g22 * g22);
    const c = u22 / norm;
    const s = g22 / norm;
    const a = u12;
    const b = u02;
    u22 = norm;
    u12 = c * a + s * g12;
    g12 = c * g12 - s * a;
    u02 = c * b + s * g02;
    g02 = c * g02 - s * b;
  }
  const tail = g11 * g11 + g12 * g12;
  if (tail > 0) {
    // Row 1 is (u11, g11, g12) in columns 1, 4 and 5.
    const norm = Math.sqrt(u11 * u11 + tail);
    const head = u11 > 0 ? -tail / (u11 + norm) : u11 - norm;
    const dot = (2 * (head * u01 + g11 * g01 + g12 * g02)) / (head * head + tail);
    u11 = norm;
    u01 -= dot * head;
    g01 -= dot * g11;
    g02 -= dot * g12;
  }
  u00 = Math.sqrt(u00 * u00 + g00 * g00 + g01 * g01 + g02 * g02);
  factor[0] = u00;
  factor[1] = u01;
  factor[2] = u02;
  factor[size + 1] = u11;
  factor[size + 2] = u12;
  factor[2 * size + 2] = u22;
}

/**
 * What the next arrival is expected to be. `sensitivity` (size) is the row h of y = h·x + noise, 1 for the phase;
 * afterwards `expected` and `expectedVariance` (h P hᵀ, without the measurement's own variance) stand in the filter.
 */
export function expectArrival(filter: WhiteningFilter, sensitivity: Float64Array): void {
  const { size, columns, means, factor, expected, projection } = filter;
  let variance = 0;
  for (let j = 0; j < size; j++) {
    let sum = 0;
    for (let i = 0; i <= j; i++) sum += factor[i * size + j]! * sensitivity[i]!;
    projection[j] = sum;
    variance += sum * sum;
  }
  filter.expectedVariance = variance;
  for (let c = 0; c < columns; c++) {
    let sum = 0;
    for (let i = 0; i < size; i++) sum += sensitivity[i]! * means[c * size + i]!;
    expected[c] = sum;
  }
}

/**
 * Takes in the arrival that `expectArrival` was called for. `values[c]` is its entry of column c, `variance` its own.
 * Afterwards `innovations`, `innovationVariance` and `gain` describe the step.
 */
export function absorbArrival(filter: WhiteningFilter, values: ArrayLike<number>, variance: number): void {
  const { size, columns, means, factor, expected, projection, innovations, gain } = filter;
  gain.fill(0);
  let sum = variance;
  for (let j = 0; j < size; j++) {
    const along = projection[j]!;
    if (along === 0) continue;
    const before = sum;
    sum += along * along;
    const shrink = Math.sqrt(before / sum);
    const pull = along / (shrink * sum);
    for (let i = 0; i <= j; i++) {
      const entry = factor[i * size + j]!;
      factor[i * size + j] = entry * shrink - gain[i]! * pull;
      gain[i] = gain[i]! + entry * along;
    }
  }
  filter.innovationVariance = sum;
  for (let i = 0; i < size; i++) gain[i] = gain[i]! / sum;
  for (let c = 0; c < columns; c++) {
    const innovation = values[c]! - expected[c]!;
    innovations[c] = innovation;
    for (let i = 0; i < size; i++) means[c * size + i] = means[c * size + i]! + gain[i]! * innovation;
  }
}

/** P ← P + sd² v vᵀ: sets the direction v (size) free again. `work` (size) is overwritten. */
export function loosen(filter: WhiteningFilter, direction: Float64Array, sd: number, work: Float64Array): void {
  const { size, factor } = filter;
  for (let i = 0; i < size; i++) work[i] = direction[i]! * sd;
  // From the last row up, a rotation of column j of U with the added column clears entry j of the latter.
  for (let j = size - 1; j >= 0; j--) {
    const extra = work[j]!;
    if (extra === 0) continue;
    const pivot = factor[j * size + j]!;
    const norm = Math.hypot(pivot, extra);
    const cosine = pivot / norm;
    const sine = extra / norm;
    for (let i = 0; i <= j; i++) {
      const a = factor[i * size + j]!;
      const b = work[i]!;
      factor[i * size + j] = cosine * a + sine * b;
      work[i] = cosine * b - sine * a;
    }
  }
}

/** P[i][j]. */
export function covariance(filter: WhiteningFilter, i: number, j: number): number {
  const { size, factor } = filter;
  let sum = 0;
  for (let k = Math.max(i, j); k < size; k++) sum += factor[i * size + k]! * factor[j * size + k]!;
  return sum;
}
