import { logSumExp } from '../math/logSumExp.ts';
import { BASE_ROWS, type GapSystem, type RecoveryColumns } from './gapSystem.ts';
import type { SizeScale } from './sizePrior.ts';

/** Δν_p and Δν̇_p; one more parameter comes with each exponential. */
export const BASE_SIZES = 2;

/**
 * The Gaussian of the sizes (Δν_p, Δν̇_p, Δν₁, … in turns and days) at one epoch and one set of timescales: each rung of
 * the prior has an exact Gaussian posterior and evidence. Room is kept between calls.
 */
export interface ConditionalSizes {
  readonly count: number;
  readonly rows: number;
  /** count × rows: the columns of the sizes. */
  readonly design: Float64Array;
  /** The data, with the shift of the count. */
  readonly data: Float64Array;
  /** Normal equations (lower triangle) and their right side. */
  readonly normal: Float64Array;
  readonly right: Float64Array;
  /** By rung: ln evidence. */
  readonly logShares: Float64Array;
  /** Of the rung solved last: prior widths, Cholesky factor and its inverse, solution. */
  readonly widths: Float64Array;
  readonly factor: Float64Array;
  readonly inverse: Float64Array;
  readonly solution: Float64Array;
}

/** Mean and covariance (count × count) of a Gaussian. */
export interface Gaussian {
  readonly mean: Float64Array;
  readonly covariance: Float64Array;
}

export function createSizes(terms: number, rungs: number): ConditionalSizes {
  const count = BASE_SIZES + terms;
  const rows = BASE_ROWS + terms;
  return {
    count,
    rows,
    design: new Float64Array(count * rows),
    data: new Float64Array(rows),
    normal: new Float64Array(count * count),
    right: new Float64Array(count),
    logShares: new Float64Array(rungs),
    widths: new Float64Array(count),
    factor: new Float64Array(count * count),
    inverse: new Float64Array(count * count),
    solution: new Float64Array(count),
  };
}

/** ln p(data | epoch, timescales), up to a constant, for an epoch `lead` days before the end of the gap. */
export function logDensityAt(
  system: GapSystem,
  recovery: RecoveryColumns,
  lead: number,
  countShift: number,
  scales: readonly SizeScale[],
  sizes: ConditionalSizes,
): number {
  writeDesign(system, recovery, lead, sizes);
  for (let row = 0; row < sizes.rows; row++) {
    sizes.data[row] = recovery.target[row]! + (row < BASE_ROWS ? countShift * system.step[row]! : 0);
  }
  writeNormalEquations(sizes);
  for (let k = 0; k < scales.length; k++) {
    sizes.logShares[k] = solveRung(sizes, scales[k]!) - 0.5 * recovery.restSquare;
  }
  return logSumExp(sizes.logShares, scales.length);
}

/** After `logDensityAt`: the Gaussian of one rung. */
export function rungSizes(sizes: ConditionalSizes, scale: SizeScale): Gaussian {
  solveRung(sizes, scale);
  return { mean: sizes.solution.slice(), covariance: covarianceOf(sizes) };
}

/**
 * Columns of Δν_p, Δν̇_p and Δνⱼ for an epoch `lead` days before the first arrival after the gap, from those in s: with
 * Δt = s + lead, minus (Δt, Δt²/2, τ(1 − e^(−Δt/τ))), because a spin-up makes pulses early.
 */
function writeDesign(system: GapSystem, recovery: RecoveryColumns, lead: number, sizes: ConditionalSizes): void {
  const { step, ramp, parabola } = system;
  const { rows, design } = sizes;
  for (let row = 0; row < BASE_ROWS; row++) {
    design[row] = -(ramp[row]! + lead * step[row]!);
    design[rows + row] = -(parabola[row]! + lead * ramp[row]! + 0.5 * lead * lead * step[row]!);
  }
  for (let j = 0; j < recovery.columns.length; j++) {
    const timescale = recovery.timescalesDays[j]!;
    const column = recovery.columns[j]!;
    const remaining = Math.exp(-lead / timescale);
    const decayed = -timescale * Math.expm1(-lead / timescale);
    const at = (BASE_SIZES + j) * rows;
    for (let row = 0; row < rows; row++)
      design[at + row] = -(remaining * column[row]! + (row < BASE_ROWS ? decayed * step[row]! : 0));
  }
}

function writeNormalEquations({ count, rows, design, data, normal, right }: ConditionalSizes): void {
  for (let i = 0; i < count; i++) {
    for (let j = 0; j <= i; j++) {
      let sum = 0;
      for (let row = 0; row < rows; row++) sum += design[i * rows + row]! * design[j * rows + row]!;
      normal[i * count + j] = sum;
    }
    let sum = 0;
    for (let row = 0; row < rows; row++) sum += design[i * rows + row]! * data[row]!;
    right[i] = sum;
  }
}

/**
 * Solution and ln evidence of one rung, by the Cholesky factor L of I + S N S with S the prior's widths and N the normal
 * equations. The misfit is taken at the solution, where an error of the solution enters by its square: the difference
 * of squares would lose its digits when the glitch is a million times the errors.
 */
function solveRung(sizes: ConditionalSizes, scale: SizeScale): number {
  const { count, rows, design, data, normal, right, widths, factor, solution } = sizes;
  let logDeterminant = 0;
  for (let i = 0; i < count; i++) {
    widths[i] = i === 0 ? scale.rate : i === 1 ? scale.second : scale.decay;
    let value = widths[i]! * right[i]!;
    for (let j = 0; j <= i; j++) {
      let sum = widths[i]! * widths[j]! * normal[i * count + j]!;
      for (let k = 0; k < j; k++) sum -= factor[i * count + k]! * factor[j * count + k]!;
      if (j < i) {
        factor[i * count + j] = sum / factor[j * count + j]!;
        value -= factor[i * count + j]! * solution[j]!;
      } else factor[i * count + i] = Math.sqrt(1 + Math.max(0, sum));
    }
    solution[i] = value / factor[i * count + i]!;
    logDeterminant += Math.log(factor[i * count + i]!);
  }
  let misfit = 0;
  for (let i = count - 1; i >= 0; i--) {
    let value = solution[i]!;
    for (let k = i + 1; k < count; k++) value -= factor[k * count + i]! * solution[k]!;
    value /= factor[i * count + i]!;
    misfit += value * value;
    solution[i] = value;
  }
  for (let i = 0; i < count; i++) solution[i] = solution[i]! * widths[i]!;
  for (let row = 0; row < rows; row++) {
    let left = data[row]!;
    for (let i = 0; i < count; i++) left -= design[i * rows + row]! * solution[i]!;
    misfit += left * left;
  }
  return scale.logShare - 0.5 * misfit - logDeterminant;
}

/** S L⁻ᵀ L⁻¹ S of the rung solved last. */
function covarianceOf({ count, widths, factor, inverse }: ConditionalSizes): Float64Array {
  const covariance = new Float64Array(count * count);
  inverse.fill(0);
  for (let j = 0; j < count; j++) {
    inverse[j * count + j] = 1 / factor[j * count + j]!;
    for (let i = j + 1; i < count; i++) {
      let sum = 0;
      for (let k = j; k < i; k++) sum -= factor[i * count + k]! * inverse[k * count + j]!;
      inverse[i * count + j] = sum / factor[i * count + i]!;
    }
  }
  for (let i = 0; i < count; i++) {
    for (let j = 0; j < count; j++) {
      let sum = 0;
      for (let k = Math.max(i, j); k < count; k++) sum += inverse[k * count + i]! * inverse[k * count + j]!;
      covariance[i * count + j] = widths[i]! * widths[j]! * sum;
    }
  }
  return covariance;
}
