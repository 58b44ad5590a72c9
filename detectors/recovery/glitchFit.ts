import { logSumExp } from '../math/logSumExp.ts';
import { type EventData, eventFrame } from './eventFrame.ts';
import { evidenceOf, type GlitchModel, glitchModels, MOST_TERMS } from './glitchModels.ts';
import type { GlitchPoint } from './glitchPosterior.ts';
import {
  addedDeviation,
  addedFrequency,
  exponentialStep,
  fraction,
  HZ,
  HZ_PER_S,
  heaviestOf,
  isRise,
  marginal,
  persistent,
  persistentSecond,
  recovered,
  total,
  totalSecond,
} from './glitchSizes.ts';
import { type Estimate, gridEstimate, logNormalEstimate } from './mixture.ts';
import { defaultSizePrior, type SizePrior } from './sizePrior.ts';
import { timescaleMarginal } from './timescaleMarginals.ts';

/** So many exponentials are stated as are ten times as probable as fewer. */
const LN_ESTABLISHED = Math.log(10);
/** Δν̇ is stated when its sd is this part of the narrowest prior width, or so many sd from 0. */
const KNOWN_BETTER = 0.7;
const AWAY_FROM_ZERO = 3;

export interface GlitchFitInput extends EventData {
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  /** Default: `defaultSizePrior`. */
  readonly sizePrior?: SizePrior;
  /** Exponentials looked for; default 3. */
  readonly mostTerms?: number;
}

/** One established exponential. */
export interface TermEstimate {
  /** A delayed rise is a part of the step that arrives late; its fraction is negative. */
  readonly kind: 'recovery' | 'delayed rise';
  readonly timescaleDays: Estimate;
  /** Δνⱼ / Δν. */
  readonly fraction: Estimate;
  readonly frequencyStepHz: Estimate;
}

export interface GlitchFit {
  /** Natural logs, on a common scale: no event; a glitch with 0, 1, … exponentials (only those worth weighing). */
  readonly logEvidenceNone: number;
  readonly logEvidenceByTerms: readonly number[];
  /** Of a glitch whatever its recovery, by the prior probabilities of the models. */
  readonly logEvidence: number;
  /** Most probable epoch, days from the pivot. */
  readonly bestEpochDays: number;
  /** Those of the most probable glitch. */
  readonly bestTimescalesDays: readonly number[];
  readonly epochDays: Estimate;
  /** The whole step at the epoch, Δν_p + Σ Δνⱼ over what decays; positive is a spin-up. */
  readonly deltaNuHz: Estimate;
  /** At the epoch, Δν̇_p − Σ Δνⱼ/τⱼ over what decays. */
  readonly deltaNuDotHzPerS: Estimate;
  /** False while the estimate of Δν̇ says little that the prior did not. */
  readonly deltaNuDotConstrained: boolean;
  /** Δν_p and Δν̇_p: what stays. */
  readonly persistentNuHz: Estimate;
  readonly persistentNuDotHzPerS: Estimate;
  /** The established exponentials, quickest first, and Q = Σ Δνⱼ/Δν over what decays; null while none is established. */
  readonly recovery: { readonly terms: readonly TermEstimate[]; readonly q: Estimate } | null;
  /** Deviation (turns, late positive, counts as given) that the most probable glitch adds; 0 before its epoch. */
  readonly curve: (tDays: number) => number;
  /** What the most probable glitch adds to ν, Hz. */
  readonly frequencyCurve: (tDays: number) => number;
}

/**
 * The posterior of one glitch: a joint grid over the epoch in its gap(s) and the timescales of 0, 1, 2 or 3 exponentials,
 * with the sizes and everything else linear marginalised exactly. Phase is continuous at the epoch. Epoch flat over the
 * candidate gaps; timescales flat in their logarithm; sizes by `SizePrior`; spin, offsets, dispersion and other events flat.
 * The whole turns given are one solution: others that put the epoch elsewhere in the gap are part of the posterior.
 * Epoch and sizes are averaged over the models, each weighted by its evidence: with few arrivals a recovery can be
 * hidden, and the intervals must say so.
 * Model and symbols as in Yu et al. 2013, MNRAS 429, 688.
 * @throws RangeError when no candidate gap lies between arrivals in use.
 */
export function fitGlitch(input: GlitchFitInput): GlitchFit {
  const frame = eventFrame(input);
  const prior = sizePriorOf(input);
  const models = glitchModels(frame, prior, input.mostTerms ?? MOST_TERMS);
  const all = models.flatMap(({ points }) => points);
  const terms = establishedTerms(models);
  const { points: stated, timescales } = models[terms]!;
  const best = stated.reduce((a, b) => (b.logDensity > a.logDensity ? b : a));
  const deltaNuDotHzPerS = marginal(all, totalSecond, HZ_PER_S);
  return {
    logEvidenceNone: -0.5 * frame.data.reduce((sum, entry) => sum + entry * entry, 0),
    logEvidenceByTerms: models.map(({ logEvidence }) => logEvidence),
    logEvidence: logSumExp(models.map(({ logWeight }) => logWeight)),
    bestEpochDays: best.epochDays,
    bestTimescalesDays: best.timescalesDays,
    epochDays: gridMarginal(all, ({ epochDays }) => epochDays),
    deltaNuHz: marginal(all, total, HZ),
    deltaNuDotHzPerS,
    deltaNuDotConstrained: isConstrained(deltaNuDotHzPerS, prior),
    persistentNuHz: marginal(all, persistent, HZ),
    persistentNuDotHzPerS: marginal(all, persistentSecond, HZ_PER_S),
    recovery:
      terms === 0
        ? null
        : {
            terms: Array.from({ length: terms }, (_, j) => ({
              kind: isRise(best, j) ? 'delayed rise' : 'recovery',
              timescaleDays: logNormalEstimate(timescaleMarginal(timescales, j)),
              fraction: marginal(stated, fraction(j)),
              frequencyStepHz: marginal(stated, exponentialStep(j), HZ),
            })),
            q: marginal(all, recovered),
          },
    curve: (tDays) => addedDeviation(best, tDays),
    frequencyCurve: (tDays) => addedFrequency(best, tDays),
  };
}

/**
 * ln evidence of a glitch with exponentials of these timescales and no others, on the scale of `fitGlitch` up to the prior of
 * the timescales: a hundredth of the work, to compare counts by.
 * @throws RangeError when no candidate gap lies between arrivals in use.
 */
export function logEvidenceAt(input: GlitchFitInput, timescalesDays: readonly number[]): number {
  return evidenceOf(eventFrame(input), sizePriorOf(input), timescalesDays);
}

function sizePriorOf({ sizePrior, frequencyHz, frequencyDerivativeHzPerS }: GlitchFitInput): SizePrior {
  return sizePrior ?? defaultSizePrior(frequencyHz, frequencyDerivativeHzPerS);
}

/** By the data: known better than the narrowest rung of the prior would have it, or away from 0 whatever the prior. */
function isConstrained({ median, sd }: Estimate, { derivativeStepsHzPerS }: SizePrior): boolean {
  return sd < KNOWN_BETTER * Math.min(...derivativeStepsHzPerS) || Math.abs(median) > AWAY_FROM_ZERO * sd;
}

/** The largest number of exponentials that is established against fewer. */
function establishedTerms(models: readonly GlitchModel[]): number {
  for (let terms = models.length - 1; terms > 0; terms--) {
    const weights = models.map(({ logWeight }) => logWeight);
    if (logSumExp(weights.slice(terms)) - logSumExp(weights.slice(0, terms)) > LN_ESTABLISHED) return terms;
  }
  return 0;
}

function gridMarginal(points: readonly GlitchPoint[], of: (point: GlitchPoint) => number): Estimate {
  const heaviest = heaviestOf(points);
  return gridEstimate(
    Float64Array.from(points, of),
    Float64Array.from(points, ({ logMass }) => Math.exp(logMass - heaviest)),
  );
}
