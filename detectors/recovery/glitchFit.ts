import { logSumExp } from '../math/logSumExp.ts';
import { type EventData, eventFrame } from './eventFrame.ts';
import { gapSystem, withoutRecovery } from './gapSystem.ts';
import { explore, type GlitchPoint } from './glitchPosterior.ts';
import { type Estimate, gridEstimate, mixtureEstimate } from './mixture.ts';
import { defaultSizePrior, type SizePrior, sizeScales } from './sizePrior.ts';
import { scanTimescales } from './timescaleScan.ts';

const SECONDS_PER_DAY = 86_400;
/** Turns per day, and per day², in Hz and Hz/s. */
const HZ = 1 / SECONDS_PER_DAY;
const HZ_PER_S = HZ / SECONDS_PER_DAY;

/** A recovery is stated as one when its evidence is ten times that of a glitch without. */
const LN_RECOVERY_EVIDENCE = Math.log(10);

export interface GlitchFitInput extends EventData {
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  /** Default: `defaultSizePrior`. */
  readonly sizePrior?: SizePrior;
}

export interface RecoveryEstimate {
  readonly timescaleDays: Estimate;
  /** Δν₁ / Δν; with one exponential this is Q. */
  readonly fraction: Estimate;
  readonly frequencyStepHz: Estimate;
}

export interface GlitchFit {
  /** Natural logs, on a common scale: no event, a glitch without, a glitch with one exponential recovery. */
  readonly logEvidenceNone: number;
  readonly logEvidencePlain: number;
  readonly logEvidenceRecovery: number;
  /** 1 when the evidence for a recovery is at least tenfold. */
  readonly recoveryTerms: 0 | 1;
  /** Most probable epoch, days from the pivot. */
  readonly bestEpochDays: number;
  readonly epochDays: Estimate;
  /** At the epoch, Δν_p + Δν₁; positive is a spin-up. */
  readonly deltaNuHz: Estimate;
  /** At the epoch, Δν̇_p − Δν₁/τ. */
  readonly deltaNuDotHzPerS: Estimate;
  /** Δν_p and Δν̇_p: what stays. */
  readonly persistentNuHz: Estimate;
  readonly persistentNuDotHzPerS: Estimate;
  readonly recovery: RecoveryEstimate | null;
  /** Deviation (turns, late positive, counts as given) that the most probable glitch adds; 0 before its epoch. */
  readonly curve: (tDays: number) => number;
  /** What the most probable glitch adds to ν, Hz. */
  readonly frequencyCurve: (tDays: number) => number;
}

/**
 * The posterior of one glitch: a joint grid over the epoch in its gap(s) and the recovery's timescale, with the sizes
 * and everything else linear marginalised exactly. Phase is continuous at the epoch. Epoch flat over the candidate gaps;
 * timescale flat in its logarithm; sizes by `SizePrior`; spin, offsets, dispersion and other events flat.
 * The whole turns given are one solution: others that put the epoch elsewhere in the gap are part of the posterior.
 * Epoch and sizes are averaged over both models, each weighted by its evidence: with few arrivals a recovery can be
 * hidden, and the intervals must say so.
 * Model and symbols as in Yu et al. 2013, MNRAS 429, 688.
 * @throws RangeError when no candidate gap lies between arrivals in use.
 */
export function fitGlitch(input: GlitchFitInput): GlitchFit {
  const frame = eventFrame(input);
  const prior = input.sizePrior ?? defaultSizePrior(input.frequencyHz, input.frequencyDerivativeHzPerS);
  const scales = sizeScales(prior);
  const systems = frame.gaps.map((gap) => gapSystem(frame, gap));
  const plain = systems.map((system) => explore(frame, system, withoutRecovery(system), scales));
  const logEvidencePlain = logSumExp(plain.map(({ logEvidence }) => logEvidence));
  const decaying = systems.map((system) => scanTimescales(frame, system, scales));
  const logEvidenceRecovery = logSumExp(decaying.map(({ logEvidence }) => logEvidence));
  const plainPoints = significant(plain.flatMap((cloud) => cloud.points));
  const decayingPoints = significant(decaying.flatMap((cloud) => cloud.points));
  const recovers = logEvidenceRecovery - logEvidencePlain > LN_RECOVERY_EVIDENCE;
  return {
    logEvidenceNone: -0.5 * frame.data.reduce((sum, entry) => sum + entry * entry, 0),
    logEvidencePlain,
    logEvidenceRecovery,
    recoveryTerms: recovers ? 1 : 0,
    ...describeSizes(significant([...plainPoints, ...decayingPoints])),
    recovery: recovers ? describeRecovery(decayingPoints) : null,
    ...describeBest(recovers ? decayingPoints : plainPoints),
  };
}

/** The points that hold all but a hundred-thousandth of the posterior or so. */
function significant(points: readonly GlitchPoint[]): GlitchPoint[] {
  const heaviest = heaviestOf(points);
  return points.filter(({ logMass }) => logMass > heaviest - 12);
}

type Sizes = Pick<
  GlitchFit,
  'epochDays' | 'deltaNuHz' | 'deltaNuDotHzPerS' | 'persistentNuHz' | 'persistentNuDotHzPerS'
>;

function describeSizes(points: readonly GlitchPoint[]): Sizes {
  const weights = weightsOf(points);
  return {
    epochDays: gridEstimate(
      Float64Array.from(points, ({ epochDays }) => epochDays),
      weights,
    ),
    deltaNuHz: marginal(points, weights, (point) => project(point, [1, 0, 1]), HZ),
    deltaNuDotHzPerS: marginal(points, weights, (point) => project(point, [0, 1, -1 / point.timescaleDays]), HZ_PER_S),
    persistentNuHz: marginal(points, weights, (point) => project(point, [1, 0, 0]), HZ),
    persistentNuDotHzPerS: marginal(points, weights, (point) => project(point, [0, 1, 0]), HZ_PER_S),
  };
}

function describeRecovery(points: readonly GlitchPoint[]): RecoveryEstimate {
  const weights = weightsOf(points);
  return {
    timescaleDays: gridEstimate(
      Float64Array.from(points, ({ timescaleDays }) => timescaleDays),
      weights,
    ),
    fraction: marginal(points, weights, fraction, 1),
    frequencyStepHz: marginal(points, weights, (point) => project(point, [0, 0, 1]), HZ),
  };
}

function describeBest(points: readonly GlitchPoint[]): Pick<GlitchFit, 'bestEpochDays' | 'curve' | 'frequencyCurve'> {
  const best = points.reduce((a, b) => (b.logDensity > a.logDensity ? b : a));
  return {
    bestEpochDays: best.epochDays,
    curve: (tDays) => addedDeviation(best, tDays),
    frequencyCurve: (tDays) => addedFrequency(best, tDays),
  };
}

function weightsOf(points: readonly GlitchPoint[]): Float64Array {
  const heaviest = heaviestOf(points);
  return Float64Array.from(points, ({ logMass }) => Math.exp(logMass - heaviest));
}

function heaviestOf(points: readonly GlitchPoint[]): number {
  return points.reduce((most, { logMass }) => Math.max(most, logMass), Number.NEGATIVE_INFINITY);
}

/** @param unit factor from turns and days to the unit stated. */
function marginal(
  points: readonly GlitchPoint[],
  weights: Float64Array,
  of: (point: GlitchPoint) => Gaussian,
  unit: number,
): Estimate {
  const means = new Float64Array(points.length);
  const sds = new Float64Array(points.length);
  points.forEach((point, i) => {
    const { mean, sd } = of(point);
    means[i] = mean * unit;
    sds[i] = sd * unit;
  });
  return mixtureEstimate({ weights, means, sds });
}

interface Gaussian {
  readonly mean: number;
  readonly sd: number;
}

/** A linear combination of the sizes. */
function project(point: GlitchPoint, direction: readonly [number, number, number]): Gaussian {
  const [a, b, c] = direction;
  const [p, q, d] = point.mean;
  const [pp, pq, pd, qq, qd, dd] = point.covariance;
  const variance = a * a * pp + b * b * qq + c * c * dd + 2 * (a * b * pq + a * c * pd + b * c * qd);
  return { mean: a * p + b * q + c * d, sd: Math.sqrt(Math.max(0, variance)) };
}

/** Δν₁/Δν, its spread to first order. */
function fraction(point: GlitchPoint): Gaussian {
  const [p, , d] = point.mean;
  const total = p + d;
  const ratio = d / total;
  return { mean: ratio, sd: project(point, [-ratio / total, 0, (1 - ratio) / total]).sd };
}

function addedDeviation(point: GlitchPoint, tDays: number): number {
  const since = tDays - point.epochDays;
  if (since <= 0) return 0;
  const [p, q, d] = point.mean;
  const { timescaleDays, countShift } = point;
  return -(p * since + 0.5 * q * since * since - d * timescaleDays * Math.expm1(-since / timescaleDays)) - countShift;
}

function addedFrequency(point: GlitchPoint, tDays: number): number {
  const since = tDays - point.epochDays;
  if (since <= 0) return 0;
  const [p, q, d] = point.mean;
  return (p + q * since + d * Math.exp(-since / point.timescaleDays)) / SECONDS_PER_DAY;
}
