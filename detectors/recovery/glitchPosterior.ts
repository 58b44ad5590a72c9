import { logAddExp } from '../math/logSumExp.ts';
import { conditionalSizes, createSizes } from './conditionalSizes.ts';
import { epochGrids } from './epochGrid.ts';
import type { EventFrame } from './eventFrame.ts';
import type { GapSystem, RecoveryColumn } from './gapSystem.ts';
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
  const sizes = createSizes(scales.length);
  for (const grid of epochGrids(system, recovery, widestOf(scales))) {
    const { leads } = grid;
    for (let i = 0; i < leads.length; i++) {
      const width = 0.5 * (leads[Math.min(i + 1, leads.length - 1)]! - leads[Math.max(i - 1, 0)]!);
      conditionalSizes(system, recovery, leads[i]!, grid.countShift, scales, sizes);
      const logDensity = sizes.logDensity + grid.logWeight - Math.log(frame.windowDays);
      const logMass = logDensity + Math.log(width);
      logEvidence = logAddExp(logEvidence, logMass);
      if (logMass < heaviest - NEGLIGIBLE) continue;
      heaviest = Math.max(heaviest, logMass);
      const [p = 0, q = 0, d = 0] = sizes.mean;
      const [pp = 0, pq = 0, pd = 0, qq = 0, qd = 0, dd = 0] = sizes.covariance;
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
