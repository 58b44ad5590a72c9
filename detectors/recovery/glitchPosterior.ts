import { logAddExp } from '../math/logSumExp.ts';
import { type ConditionalSizes, createSizes, type Gaussian, logDensityAt, rungSizes } from './conditionalSizes.ts';
import { backwardCurve, epochGrids } from './epochGrid.ts';
import type { EventFrame } from './eventFrame.ts';
import type { GapSystem, RecoveryColumns } from './gapSystem.ts';
import { type SizeScale, widestOf } from './sizePrior.ts';

/**
 * One point of the posterior: an epoch, timescales, a shift of the count and a rung of the size prior, with the exact
 * Gaussian of the sizes (Δν_p, Δν̇_p, Δν₁, … in turns and days) given these.
 */
export interface GlitchPoint extends Gaussian {
  readonly epochDays: number;
  readonly timescalesDays: readonly number[];
  /** Whole turns added to the deviations after the event. */
  readonly countShift: number;
  /** ln of the posterior mass (not normalised) that the point stands for. */
  readonly logMass: number;
  /** ln of the posterior density per day at the point. */
  readonly logDensity: number;
}

/** Spots lighter than e⁻⁹ of the heaviest change nothing that is reported, nor do rungs that hold less than e⁻⁶ of a spot. */
const NEGLIGIBLE = 9;
const LEAST_RUNG = -6;

/** A place in the gap, before its sizes are worked out. */
export interface Spot {
  readonly lead: number;
  readonly countShift: number;
  readonly logMass: number;
}

/** The posterior over one gap for one set of timescales, integrated over the epoch. */
export interface EpochPosterior {
  readonly system: GapSystem;
  readonly recovery: RecoveryColumns;
  /** Room for the sizes at a spot. */
  readonly sizes: ConditionalSizes;
  readonly spots: readonly Spot[];
  readonly logEvidence: number;
  /** By rung of the size prior: ln of its largest mass at any spot, over that of the heaviest spot. */
  readonly rungs: Float64Array;
}

/** `hopeless`: timescales whose evidence is sure to be below are not integrated; what it can be at most stands for it. */
export function explore(
  frame: EventFrame,
  system: GapSystem,
  recovery: RecoveryColumns,
  scales: readonly SizeScale[],
  hopeless = Number.NEGATIVE_INFINITY,
): EpochPosterior {
  const spots: Spot[] = [];
  const rungs = new Float64Array(scales.length).fill(Number.NEGATIVE_INFINITY);
  let logEvidence = Number.NEGATIVE_INFINITY;
  let heaviest = Number.NEGATIVE_INFINITY;
  const sizes = createSizes(recovery.columns.length, scales.length);
  // With its phase step free as well no glitch fits better.
  const most = -0.5 * recovery.restSquare;
  if (most < hopeless) return { system, recovery, sizes, spots, logEvidence: most, rungs };
  const curve = backwardCurve(system, recovery, widestOf(scales));
  for (const { leads, countShift, logWeight } of epochGrids(system, curve)) {
    for (let i = 0; i < leads.length; i++) {
      const width = 0.5 * (leads[Math.min(i + 1, leads.length - 1)]! - leads[Math.max(i - 1, 0)]!);
      const lead = leads[i]!;
      const shareOfWindow = logWeight + Math.log(width / frame.windowDays);
      const logMass = logDensityAt(system, recovery, lead, countShift, scales, sizes) + shareOfWindow;
      logEvidence = logAddExp(logEvidence, logMass);
      if (logMass < heaviest - NEGLIGIBLE) continue;
      heaviest = Math.max(heaviest, logMass);
      for (let k = 0; k < rungs.length; k++) rungs[k] = Math.max(rungs[k]!, sizes.logShares[k]! + shareOfWindow);
      spots.push({ lead, countShift, logMass });
    }
  }
  return { system, recovery, sizes, spots, logEvidence, rungs: rungs.map((mass) => mass - heaviest) };
}

/** The points at one spot, one for each rung that counts. `logMass`: ln of the posterior mass that they share. */
export function pointsAt(
  { system, recovery, sizes }: EpochPosterior,
  { lead, countShift }: Spot,
  scales: readonly SizeScale[],
  logMass: number,
): GlitchPoint[] {
  const logDensity = logDensityAt(system, recovery, lead, countShift, scales, sizes);
  const logShares = sizes.logShares.map((ofRung) => ofRung - logDensity);
  return scales.flatMap((scale, k) =>
    logShares[k]! < LEAST_RUNG
      ? []
      : {
          epochDays: system.gap.endDays - lead,
          timescalesDays: recovery.timescalesDays,
          countShift,
          logMass: logMass + logShares[k]!,
          logDensity: logDensity + logShares[k]!,
          ...rungSizes(sizes, scale),
        },
  );
}
