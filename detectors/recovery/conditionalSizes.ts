import { logSumExp } from '../math/logSumExp.ts';
import { type GapSystem, type RecoveryColumn, ROWS } from './gapSystem.ts';
import type { SizeScale } from './sizePrior.ts';

/** The Gaussian of the sizes (Δν_p, Δν̇_p, Δν₁ in turns and days) at one epoch and timescale, and room to compute it. */
export interface ConditionalSizes {
  /** ROWS × 3: the columns of Δν_p, Δν̇_p, Δν₁. */
  readonly design: Float64Array;
  /** Normal equations: pp, pq, pd, qq, qd, dd; their right side; the square of the data. */
  readonly normal: Float64Array;
  /** By rung of the size prior: ln evidence, mean, covariance. */
  readonly logShares: Float64Array;
  readonly means: Float64Array;
  readonly covariances: Float64Array;
  /** Over all rungs. Covariance: upper triangle by rows. */
  readonly mean: Float64Array;
  readonly covariance: Float64Array;
  /** ln p(data | epoch, timescale), up to a constant. */
  logDensity: number;
}

export function createSizes(scaleCount: number): ConditionalSizes {
  return {
    design: new Float64Array(3 * ROWS),
    normal: new Float64Array(10),
    logShares: new Float64Array(scaleCount),
    means: new Float64Array(3 * scaleCount),
    covariances: new Float64Array(6 * scaleCount),
    mean: new Float64Array(3),
    covariance: new Float64Array(6),
    logDensity: 0,
  };
}

/**
 * Fills `sizes` for an epoch `lead` days before the end of the gap: each rung of the prior has an exact Gaussian
 * posterior and evidence; the rungs are averaged and their Gaussians joined, moments kept.
 */
export function conditionalSizes(
  system: GapSystem,
  recovery: RecoveryColumn,
  lead: number,
  countShift: number,
  scales: readonly SizeScale[],
  sizes: ConditionalSizes,
): void {
  writeDesign(system, recovery, lead, sizes.design);
  writeNormalEquations(system, recovery, countShift, sizes);
  for (let k = 0; k < scales.length; k++) solveRung(sizes, k, scales[k]!, recovery.decays);
  sizes.logDensity = logSumExp(sizes.logShares);
  matchMoments(sizes);
}

function writeNormalEquations(
  system: GapSystem,
  recovery: RecoveryColumn,
  countShift: number,
  { design, normal }: ConditionalSizes,
): void {
  normal.fill(0);
  normal[9] = recovery.restSquare;
  for (let row = 0; row < ROWS; row++) {
    const z = recovery.target[row]! + countShift * system.step[row]!;
    const p = design[3 * row]!;
    const q = design[3 * row + 1]!;
    const d = design[3 * row + 2]!;
    normal[0] = normal[0]! + p * p;
    normal[1] = normal[1]! + p * q;
    normal[2] = normal[2]! + p * d;
    normal[3] = normal[3]! + q * q;
    normal[4] = normal[4]! + q * d;
    normal[5] = normal[5]! + d * d;
    normal[6] = normal[6]! + p * z;
    normal[7] = normal[7]! + q * z;
    normal[8] = normal[8]! + d * z;
    normal[9] = normal[9]! + z * z;
  }
}

/** By the Cholesky factor L of I + S G S, where S holds the prior's widths and G the normal equations. */
function solveRung(sizes: ConditionalSizes, k: number, scale: SizeScale, decays: boolean): void {
  const { normal, logShares, means, covariances } = sizes;
  const sp = scale.rate;
  const sq = scale.second;
  const sd = decays ? sp : 0;
  const l00 = Math.sqrt(1 + sp * sp * normal[0]!);
  const l10 = (sp * sq * normal[1]!) / l00;
  const l20 = (sp * sd * normal[2]!) / l00;
  const l11 = Math.sqrt(Math.max(1, 1 + sq * sq * normal[3]! - l10 * l10));
  const l21 = (sq * sd * normal[4]! - l10 * l20) / l11;
  const l22 = Math.sqrt(Math.max(1, 1 + sd * sd * normal[5]! - l20 * l20 - l21 * l21));
  const u0 = (sp * normal[6]!) / l00;
  const u1 = (sq * normal[7]! - l10 * u0) / l11;
  const u2 = (sd * normal[8]! - l20 * u0 - l21 * u1) / l22;
  const unexplained = normal[9]! - u0 * u0 - u1 * u1 - u2 * u2;
  logShares[k] = -0.5 * unexplained - Math.log(l00 * l11 * l22 * logShares.length);
  // L⁻¹; then the mean is S L⁻ᵀ u and the covariance S L⁻ᵀ L⁻¹ S.
  const i00 = 1 / l00;
  const i11 = 1 / l11;
  const i22 = 1 / l22;
  const i10 = -l10 * i00 * i11;
  const i21 = -l21 * i11 * i22;
  const i20 = -(l20 * i00 + l21 * i10) * i22;
  means[3 * k] = sp * (i00 * u0 + i10 * u1 + i20 * u2);
  means[3 * k + 1] = sq * (i11 * u1 + i21 * u2);
  means[3 * k + 2] = sd * i22 * u2;
  covariances[6 * k] = sp * sp * (i00 * i00 + i10 * i10 + i20 * i20);
  covariances[6 * k + 1] = sp * sq * (i10 * i11 + i20 * i21);
  covariances[6 * k + 2] = sp * sd * i20 * i22;
  covariances[6 * k + 3] = sq * sq * (i11 * i11 + i21 * i21);
  covariances[6 * k + 4] = sq * sd * i21 * i22;
  covariances[6 * k + 5] = sd * sd * i22 * i22;
}

/** Mean and covariance of a mixture of three-dimensional Gaussians. */
function matchMoments({ logShares, logDensity, means, covariances, mean, covariance }: ConditionalSizes): void {
  mean.fill(0);
  covariance.fill(0);
  for (let k = 0; k < logShares.length; k++) {
    const share = Math.exp(logShares[k]! - logDensity);
    for (let i = 0; i < 3; i++) mean[i] = mean[i]! + share * means[3 * k + i]!;
  }
  for (let k = 0; k < logShares.length; k++) {
    const share = Math.exp(logShares[k]! - logDensity);
    if (share < 1e-9) continue;
    let entry = 0;
    for (let i = 0; i < 3; i++) {
      for (let j = i; j < 3; j++) {
        const product = (means[3 * k + i]! - mean[i]!) * (means[3 * k + j]! - mean[j]!);
        covariance[entry] = covariance[entry]! + share * (covariances[6 * k + entry]! + product);
        entry += 1;
      }
    }
  }
}

/**
 * Columns of Δν_p, Δν̇_p and Δν₁ for an epoch `lead` days before the first arrival after the gap, from those in s: with
 * Δt = s + lead, minus (Δt, Δt²/2, τ(1 − e^(−Δt/τ))), because a spin-up makes pulses early.
 */
function writeDesign(system: GapSystem, recovery: RecoveryColumn, lead: number, design: Float64Array): void {
  const { step, ramp, parabola } = system;
  const { column, timescaleDays, decays } = recovery;
  const remaining = Math.exp(-lead / timescaleDays);
  const decayed = -timescaleDays * Math.expm1(-lead / timescaleDays);
  for (let row = 0; row < ROWS; row++) {
    design[3 * row] = -(ramp[row]! + lead * step[row]!);
    design[3 * row + 1] = -(parabola[row]! + lead * ramp[row]! + 0.5 * lead * lead * step[row]!);
    design[3 * row + 2] = decays ? -(decayed * step[row]! + remaining * column[row]!) : 0;
  }
}
