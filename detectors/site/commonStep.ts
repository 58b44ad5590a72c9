/**
 * Is there one step in time that several pulsars show? The exact Bayes factor of a common step Δt against none, its size
 * marginalised: each pulsar sees Δt ν modulo one turn, so the posterior of Δt is a mixture of normal distributions, which
 * each pulsar in turn multiplies by a wrapped normal one. In a pulsar that glitched that night, or whose session is bad,
 * the phase may stand anywhere, with or without the step: one pulsar alone proves nothing of a clock.
 */

import { logAddExp, logSumExp } from '../math/logSumExp.ts';
import type { PhaseStep } from './gapEvidence.ts';

export interface Witness extends PhaseStep {
  readonly frequencyHz: number;
  /** Days between the sessions on both sides. */
  readonly gapDays: number;
}

export interface CommonStep {
  /** ln P(phases | a common step) − ln P(phases | none). */
  readonly logBayesFactor: number;
  readonly stepS: number;
  readonly uncertaintyS: number;
}

/** What one pulsar says of a step of known size. */
export interface Testimony {
  /** ln P(phase | the step) − ln P(phase | none). */
  readonly logRatio: number;
  /** Probability that it shows the step and nothing of its own. */
  readonly agrees: number;
}

/** σ of a step of the clock, seconds, with the share of each (common practice, no source). */
const SIZES: readonly (readonly [share: number, sigmaS: number])[] = [
  [0.35, 3e-5],
  [0.35, 1e-3],
  [0.3, 1],
];
/** A session that is wrong has its phase anywhere in the turn. */
const BAD_SHARE = 0.02;
/** How often a pulsar, or its receiver, does something of its own that moves its phase: all explanations together. */
const OWN_PER_YEAR = 0.1;
const DAYS_PER_YEAR = 365.25;
const MOST_OWN_SHARE = 0.05;
const WIDEST_SPREAD_TURNS = 0.3;
/** Parts of the mixture this far below the heaviest are dropped, and all beyond so many. */
const FLOOR_NATS = 20;
const MOST_PARTS = 3000;
const REACH_SIGMAS = 6;
/** One pulsar alone does not say where the step was. */
const MOST_MISFIT_NATS = 200;
/** Parts whose means differ by less than this are one. */
const ALIKE_SIGMAS = 0.3;

interface Part {
  readonly logWeight: number;
  readonly stepS: number;
  readonly varianceS2: number;
}

/** @param witnesses one each of several pulsars; the answer does not depend on their order. */
export function commonStep(witnesses: readonly Witness[]): CommonStep {
  let parts: Part[] = SIZES.map(([share, sigma]) => ({ logWeight: Math.log(share), stepS: 0, varianceS2: sigma ** 2 }));
  let nothing = 0;
  // The slowest first: a fast pulsar alone would leave a thousand whole turns open.
  for (const witness of [...witnesses].sort(bySlowness)) {
    parts = lightened(parts.flatMap((part) => multiplied(part, witness)));
    nothing += logDensity(witness, 0, 0);
  }
  return { logBayesFactor: logSumExp(parts.map((p) => p.logWeight)) - nothing, ...heaviest(parts) };
}

export function testimony(
  witness: Witness,
  { stepS, uncertaintyS }: Pick<CommonStep, 'stepS' | 'uncertaintyS'>,
): Testimony {
  const withStep = logDensity(witness, stepS, uncertaintyS ** 2);
  const turns = stepS * witness.frequencyHz;
  const variance = witness.variance + (uncertaintyS * witness.frequencyHz) ** 2;
  return {
    logRatio: withStep - logDensity(witness, 0, 0),
    agrees: Math.exp(Math.log(sharesOf(witness).plain * wrappedNormal(witness.turns - turns, variance)) - withStep),
  };
}

/**
 * By how much better the step fits the phases than none does, as normal errors have it, nats. It does not level off where everybody is sure,
 * and so it tells the gap that holds the step from those beside it, which show a part of it.
 */
export function fitGain(witnesses: readonly Witness[], stepS: number): number {
  let gain = 0;
  for (const { frequencyHz, turns, variance } of witnesses)
    gain += misfit(turns, variance) - misfit(turns - stepS * frequencyHz, variance);
  return gain;
}

function misfit(turns: number, variance: number): number {
  return Math.min(MOST_MISFIT_NATS, (0.5 * (turns - Math.round(turns)) ** 2) / variance);
}

/** Probabilities of: nothing of its own, a bad session, an event of its own. */
function sharesOf({ lasts, gapDays }: Witness): { readonly plain: number; readonly bad: number; readonly own: number } {
  const bad = lasts ? BAD_SHARE ** 2 : BAD_SHARE;
  const own = Math.min(MOST_OWN_SHARE, (OWN_PER_YEAR * gapDays) / DAYS_PER_YEAR);
  return { plain: 1 - bad - own, bad, own };
}

function bySlowness(a: Witness, b: Witness): number {
  return a.frequencyHz - b.frequencyHz || a.variance - b.variance || a.turns - b.turns;
}

/** One part of the posterior after one more pulsar: a part for every whole turn within reach, and one for "of its own". */
function multiplied({ logWeight, stepS, varianceS2 }: Part, witness: Witness): Part[] {
  const { frequencyHz: nu, turns, variance } = witness;
  const expected = stepS * nu;
  const spread = varianceS2 * nu * nu;
  const total = spread + variance;
  const reach = REACH_SIGMAS * Math.sqrt(total);
  const { plain, bad, own } = sharesOf(witness);
  const strange = bad + own * ownDensity(turns - expected, total, nu);
  const parts: Part[] = [{ logWeight: logWeight + Math.log(strange), stepS, varianceS2 }];
  for (let k = Math.ceil(expected - reach - turns); k <= expected + reach - turns; k++) {
    const off = turns + k - expected;
    parts.push({
      logWeight: logWeight + Math.log(plain) - 0.5 * ((off * off) / total + Math.log(2 * Math.PI * total)),
      stepS: stepS + (off * spread) / (nu * total),
      varianceS2: (varianceS2 * variance) / total,
    });
  }
  return parts;
}

/** ln density, per turn, of the pulsar's phase step when the clock stepped by `stepS`. */
function logDensity(witness: Witness, stepS: number, varianceS2: number): number {
  const { frequencyHz: nu, turns, variance } = witness;
  const { plain, bad, own } = sharesOf(witness);
  const total = variance + varianceS2 * nu * nu;
  const off = turns - stepS * nu;
  return Math.log(plain * wrappedNormal(off, total) + bad + own * ownDensity(off, total, nu));
}

/** Steps of a pulsar's own are as large as those of a clock. */
function ownDensity(off: number, variance: number, nu: number): number {
  let density = 0;
  for (const [share, sigma] of SIZES)
    density += share * wrappedNormal(off, variance + Math.min(sigma * nu, WIDEST_SPREAD_TURNS) ** 2);
  return density;
}

function wrappedNormal(turns: number, variance: number): number {
  const centre = turns - Math.round(turns);
  const turnsBeside = Math.ceil(REACH_SIGMAS * Math.sqrt(variance));
  if (turnsBeside > REACH_SIGMAS) return 1;
  let density = 0;
  for (let k = -turnsBeside; k <= turnsBeside; k++) density += Math.exp((-0.5 * (centre + k) ** 2) / variance);
  return density / Math.sqrt(2 * Math.PI * variance);
}

/** Without the parts that hardly count; those that say the same are one. */
function lightened(parts: readonly Part[]): Part[] {
  let best = -Infinity;
  for (const part of parts) best = Math.max(best, part.logWeight);
  const inOrder = parts.filter((part) => part.logWeight > best - FLOOR_NATS).sort((a, b) => a.stepS - b.stepS);
  const kept: Part[] = [];
  for (const part of inOrder) {
    const last = kept.at(-1);
    if (last !== undefined && alike(last, part)) kept[kept.length - 1] = joined(last, part);
    else kept.push(part);
  }
  if (kept.length <= MOST_PARTS) return kept;
  return kept.sort((a, b) => b.logWeight - a.logWeight || a.stepS - b.stepS).slice(0, MOST_PARTS);
}

function alike(a: Part, b: Part): boolean {
  const ratio = a.varianceS2 / b.varianceS2;
  return (
    ratio > 0.5 && ratio < 2 && (a.stepS - b.stepS) ** 2 < ALIKE_SIGMAS ** 2 * Math.min(a.varianceS2, b.varianceS2)
  );
}

/** One normal distribution with the mean and variance of two. */
function joined(a: Part, b: Part): Part {
  const logWeight = logAddExp(a.logWeight, b.logWeight);
  const share = Math.exp(b.logWeight - logWeight);
  const apart = b.stepS - a.stepS;
  return {
    logWeight,
    stepS: a.stepS + share * apart,
    varianceS2: (1 - share) * a.varianceS2 + share * b.varianceS2 + share * (1 - share) * apart * apart,
  };
}

/** Mean and σ of the parts that tell of the same step as the heaviest. */
function heaviest(parts: readonly Part[]): Pick<CommonStep, 'stepS' | 'uncertaintyS'> {
  const top = parts.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  let weight = 0;
  let mean = 0;
  let square = 0;
  for (const part of parts) {
    const apart = part.stepS - top.stepS;
    if (apart ** 2 > REACH_SIGMAS ** 2 * (part.varianceS2 + top.varianceS2)) continue;
    const own = Math.exp(part.logWeight - top.logWeight);
    weight += own;
    mean += own * apart;
    square += own * (part.varianceS2 + apart * apart);
  }
  mean /= weight;
  return { stepS: top.stepS + mean, uncertaintyS: Math.sqrt(square / weight - mean * mean) };
}
