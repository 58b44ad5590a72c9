import { logAddExp, logSumExp } from '../math/logSumExp.ts';
import { epochGrids } from './epochGrid.ts';
import type { EventFrame } from './eventFrame.ts';
import { type GapSystem, type RecoveryColumn, ROWS } from './gapSystem.ts';
import type { SizeScale } from './sizePrior.ts';

/**
 * One point of the posterior: an epoch, a timescale and a shift of the count, with the exact Gaussian of the sizes
 * (Δν_p, Δν̇_p, Δν₁ in turns and days) given these.
 */
export interface GlitchPoint {
  readonly epochDays: number;
  readonly timescaleDays: number;
  /** Whole turns added to the deviations after the event. */
  readonly countShift: number;
  /** ln of the posterior mass (not normalised) that the point stands for. */
  readonly logMass: number;
  /** ln of the posterior density per day at the point. */
  readonly logDensity: number;
  readonly mean: readonly [persistent: number, persistentSecond: number, decaying: number];
  /** Upper triangle by rows: pp, pq, pd, qq, qd, dd. */
  readonly covariance: readonly [number, number, number, number, number, number];
}

/** Points lighter than e⁻¹⁴ of the heaviest change nothing. */
const NEGLIGIBLE = 14;

export interface PointCloud {
  readonly points: readonly GlitchPoint[];
  readonly logEvidence: number;
}

/** The posterior over one gap at one timescale (or without recovery), integrated over the epoch. */
export function explore(
  frame: EventFrame,
  system: GapSystem,
  recovery: RecoveryColumn,
  scales: readonly SizeScale[],
): PointCloud {
  const points: GlitchPoint[] = [];
  let logEvidence = Number.NEGATIVE_INFINITY;
  let heaviest = Number.NEGATIVE_INFINITY;
  const workspace = createWorkspace(scales.length);
  for (const grid of epochGrids(system, recovery, widestOf(scales))) {
    const { leads } = grid;
    for (let i = 0; i < leads.length; i++) {
      const width = 0.5 * (leads[Math.min(i + 1, leads.length - 1)]! - leads[Math.max(i - 1, 0)]!);
      conditionalGaussian(system, recovery, leads[i]!, grid.countShift, scales, workspace);
      const logDensity = workspace.logDensity + grid.logWeight - Math.log(frame.windowDays);
      const logMass = logDensity + Math.log(width);
      logEvidence = logAddExp(logEvidence, logMass);
      if (logMass < heaviest - NEGLIGIBLE) continue;
      heaviest = Math.max(heaviest, logMass);
      const [p = 0, q = 0, d = 0] = workspace.mean;
      const [pp = 0, pq = 0, pd = 0, qq = 0, qd = 0, dd = 0] = workspace.covariance;
      points.push({
        epochDays: system.gap.endDays - leads[i]!,
        timescaleDays: recovery.timescaleDays,
        countShift: grid.countShift,
        logMass,
        logDensity,
        mean: [p, q, d],
        covariance: [pp, pq, pd, qq, qd, dd],
      });
    }
  }
  return { points: points.filter(({ logMass }) => logMass > heaviest - NEGLIGIBLE), logEvidence };
}

function widestOf(scales: readonly SizeScale[]): SizeScale {
  return {
    rate: Math.max(...scales.map(({ rate }) => rate)),
    second: Math.max(...scales.map(({ second }) => second)),
  };
}

interface Workspace {
  /** ROWS × 3: the columns of Δν_p, Δν̇_p, Δν₁. */
  readonly design: Float64Array;
  readonly logShares: Float64Array;
  readonly means: Float64Array;
  readonly covariances: Float64Array;
  readonly mean: Float64Array;
  readonly covariance: Float64Array;
  logDensity: number;
}

function createWorkspace(scaleCount: number): Workspace {
  return {
    design: new Float64Array(3 * ROWS),
    logShares: new Float64Array(scaleCount),
    means: new Float64Array(3 * scaleCount),
    covariances: new Float64Array(6 * scaleCount),
    mean: new Float64Array(3),
    covariance: new Float64Array(6),
    logDensity: 0,
  };
}

/** ln p(data | epoch, timescale), averaged over the rungs, and the Gaussian of the sizes, matched to the average. */
function conditionalGaussian(
  system: GapSystem,
  recovery: RecoveryColumn,
  lead: number,
  countShift: number,
  scales: readonly SizeScale[],
  work: Workspace,
): void {
  writeDesign(system, recovery, lead, work.design);
  const { design, logShares, means, covariances, mean, covariance } = work;
  let pp = 0;
  let pq = 0;
  let pd = 0;
  let qq = 0;
  let qd = 0;
  let dd = 0;
  let bp = 0;
  let bq = 0;
  let bd = 0;
  let square = recovery.restSquare;
  for (let row = 0; row < ROWS; row++) {
    const z = recovery.target[row]! + countShift * system.step[row]!;
    const p = design[3 * row]!;
    const q = design[3 * row + 1]!;
    const d = design[3 * row + 2]!;
    pp += p * p;
    pq += p * q;
    pd += p * d;
    qq += q * q;
    qd += q * d;
    dd += d * d;
    bp += p * z;
    bq += q * z;
    bd += d * z;
    square += z * z;
  }
  const decays = dd > 0 ? 1 : 0;
  for (let k = 0; k < scales.length; k++) {
    const sp = scales[k]!.rate;
    const sq = scales[k]!.second;
    const sd = decays * sp;
    // Cholesky factor of I + S G S for the prior widths S, then its inverse.
    const l00 = Math.sqrt(1 + sp * sp * pp);
    const l10 = (sp * sq * pq) / l00;
    const l20 = (sp * sd * pd) / l00;
    const l11 = Math.sqrt(Math.max(1, 1 + sq * sq * qq - l10 * l10));
    const l21 = (sq * sd * qd - l10 * l20) / l11;
    const l22 = Math.sqrt(Math.max(1, 1 + sd * sd * dd - l20 * l20 - l21 * l21));
    const u0 = (sp * bp) / l00;
    const u1 = (sq * bq - l10 * u0) / l11;
    const u2 = (sd * bd - l20 * u0 - l21 * u1) / l22;
    logShares[k] = -0.5 * (square - u0 * u0 - u1 * u1 - u2 * u2) - Math.log(l00 * l11 * l22 * scales.length);
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
  work.logDensity = logSumExp(logShares);
  matchMoments(logShares, work.logDensity, means, covariances, mean, covariance);
}

/** Mean and covariance of a mixture of three-dimensional Gaussians. */
function matchMoments(
  logShares: Float64Array,
  logTotal: number,
  means: Float64Array,
  covariances: Float64Array,
  mean: Float64Array,
  covariance: Float64Array,
): void {
  mean.fill(0);
  covariance.fill(0);
  for (let k = 0; k < logShares.length; k++) {
    const share = Math.exp(logShares[k]! - logTotal);
    for (let i = 0; i < 3; i++) mean[i] = mean[i]! + share * means[3 * k + i]!;
  }
  for (let k = 0; k < logShares.length; k++) {
    const share = Math.exp(logShares[k]! - logTotal);
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
  const { column, timescaleDays } = recovery;
  const remaining = Math.exp(-lead / timescaleDays);
  const decayed = -timescaleDays * Math.expm1(-lead / timescaleDays);
  const decays = column.some((entry) => entry !== 0) ? 1 : 0;
  for (let row = 0; row < ROWS; row++) {
    design[3 * row] = -(ramp[row]! + lead * step[row]!);
    design[3 * row + 1] = -(parabola[row]! + lead * ramp[row]! + 0.5 * lead * lead * step[row]!);
    design[3 * row + 2] = -decays * (decayed * step[row]! + remaining * column[row]!);
  }
}
