/**
 * One hypothesis: a Kalman filter with its own count of turns, its own story and its own weight.
 *
 * State, in turns and days: (deviation, its rate, its second derivative, then receiver offsets, dispersion, recoveries). The deviation is
 * late-positive, so a spin-up of Δν appears as a rate step of −86400 Δν. Discretisation: method of Willsky & Jones 1976
 * for the jump, exact random-walk covariances for the gap between arrivals.
 */

import { SPIN_STATES, writeProcessNoise } from '../filter/stateSpace.ts';
import type { NoiseModel } from '../report.ts';

/** What was done with each arrival, newest first; hypotheses share the part of their past that is common. */
export interface Story {
  readonly index: number;
  /** Whole turns added to the wrapped deviation. */
  readonly turns: number;
  readonly used: boolean;
  /** Not the turn that the prediction called nearest. */
  readonly slipped: boolean;
  readonly before: Story | null;
}

export interface Hypothesis {
  /** Plain arrays: thousands are copied for each arrival, and a short plain array copies several times faster. */
  readonly mean: number[];
  /** Row-major, symmetric, size² entries. */
  readonly cov: number[];
  logWeight: number;
  story: Story | null;
  /** Numbers of the event tracks that this hypothesis holds for true. */
  tracks: readonly number[];
  /** The last arrival was taken for an outlier. */
  lastSetAside: boolean;
  /** Whole turns between this count and the pulse numbers that arrivals came with; null before the first such arrival. */
  numbering: number | null;
}

export function zeros(count: number): number[] {
  return new Array<number>(count).fill(0);
}

/** The gap between two arrivals, worked out once and applied to every hypothesis. */
export interface Gap {
  readonly days: number;
  /** Covariance that the random walks add, 3×3. */
  readonly walk: Float64Array;
  readonly decays: readonly { readonly state: number; readonly turnsPerRate: number; readonly kept: number }[];
}

/** A state that holds the decaying part of the rate (turns/day) after glitches: exponentials of one timescale add up. */
export interface Decay {
  readonly state: number;
  readonly timescaleDays: number;
}

/** @param clockVariance of what is not known of a step of the site's clock in the gap, turns² */
export function gapOf(days: number, noise: NoiseModel, decays: readonly Decay[], clockVariance = 0): Gap {
  const walk = new Float64Array(SPIN_STATES * SPIN_STATES);
  writeProcessNoise(days, noise, walk);
  walk[0]! += clockVariance;
  return {
    days,
    walk,
    decays: decays.map(({ state, timescaleDays }) => {
      const lost = -Math.expm1(-days / timescaleDays);
      return { state, turnsPerRate: timescaleDays * lost, kept: 1 - lost };
    }),
  };
}

export function copyOf(h: Hypothesis, tracks: readonly number[] = h.tracks): Hypothesis {
  return {
    mean: h.mean.slice(),
    cov: h.cov.slice(),
    logWeight: h.logWeight,
    story: h.story,
    tracks,
    lastSetAside: h.lastSetAside,
    numbering: h.numbering,
  };
}

/** Carries mean and covariance over the gap: x ← F x, P ← F P Fᵀ + Q. */
export function propagate(h: Hypothesis, gap: Gap): void {
  const { mean, cov } = h;
  const size = mean.length;
  const t = gap.days;
  const half = (t * t) / 2;
  mean[0]! += t * mean[1]! + half * mean[2]!;
  mean[1]! += t * mean[2]!;
  for (let j = 0; j < size; j++) {
    const c2 = cov[2 * size + j]!;
    cov[j]! += t * cov[size + j]! + half * c2;
    cov[size + j]! += t * c2;
  }
  for (let row = 0; row < size * size; row += size) {
    const c2 = cov[row + 2]!;
    cov[row]! += t * cov[row + 1]! + half * c2;
    cov[row + 1]! += t * c2;
  }
  for (const { state, turnsPerRate, kept } of gap.decays) {
    mean[0]! += turnsPerRate * mean[state]!;
    mean[state]! *= kept;
    for (let j = 0; j < size; j++) {
      cov[j]! += turnsPerRate * cov[state * size + j]!;
      cov[state * size + j]! *= kept;
    }
    for (let row = 0; row < size * size; row += size) {
      cov[row]! += turnsPerRate * cov[row + state]!;
      cov[row + state]! *= kept;
    }
  }
  for (let i = 0; i < SPIN_STATES; i++)
    for (let j = 0; j < SPIN_STATES; j++) cov[i * size + j]! += gap.walk[i * SPIN_STATES + j]!;
}

/** How an arrival sees the state: the deviation plus the given multiples of the nuisances. */
export interface Sight {
  /** Coefficients of all states; the first is 1. */
  readonly row: readonly number[];
  /** The states that it sees at all. */
  readonly seen: readonly number[];
  /** True when only the deviation is seen: the common and faster case. */
  readonly plain: boolean;
}

export function sightOf(row: readonly number[]): Sight {
  const seen: number[] = [];
  for (let state = 0; state < row.length; state++) if (row[state] !== 0) seen.push(state);
  return { row, seen, plain: seen.length === 1 };
}

/** Scratch of one prediction: expected deviation, its variance without measurement noise, and P·row. */
export interface Prediction {
  deviation: number;
  variance: number;
  readonly gain: number[];
  /** The deviation alone was seen. */
  plain: boolean;
}

export function predict(h: Hypothesis, sight: Sight, into: Prediction): void {
  const { mean, cov } = h;
  const size = mean.length;
  const { gain } = into;
  into.plain = sight.plain;
  if (sight.plain) {
    for (let i = 0; i < size; i++) gain[i] = cov[i]!;
    into.deviation = mean[0]!;
    into.variance = cov[0]!;
    return;
  }
  const { row, seen } = sight;
  let deviation = 0;
  let variance = 0;
  for (let i = 0; i < size; i++) gain[i] = 0;
  for (const j of seen) {
    const factor = row[j]!;
    // Symmetric: the row is read instead of the column.
    for (let i = 0; i < size; i++) gain[i]! += cov[j * size + i]! * factor;
    deviation += mean[j]! * factor;
  }
  for (const i of seen) variance += gain[i]! * row[i]!;
  into.deviation = deviation;
  into.variance = variance;
}

/**
 * Takes the innovation in: x ← x + P h e/S, P ← P − P h hᵀ P / S, symmetric by construction. Where the deviation alone
 * was seen, its own row is P₀ⱼ R/S: the difference of near-equal numbers would lose the digits of a wide prior.
 */
export function absorb(h: Hypothesis, prediction: Prediction, innovation: number, innovationVariance: number): void {
  const { mean, cov } = h;
  const size = mean.length;
  const { gain } = prediction;
  const inverse = 1 / innovationVariance;
  for (let i = 0; i < size; i++) {
    const k = gain[i]! * inverse;
    mean[i]! += k * innovation;
    for (let j = 0; j <= i; j++) {
      const value = cov[i * size + j]! - k * gain[j]!;
      cov[i * size + j] = value;
      cov[j * size + i] = value;
    }
  }
  if (!prediction.plain) return;
  const kept = (innovationVariance - prediction.variance) * inverse;
  for (let j = 0; j < size; j++) {
    cov[j] = gain[j]! * kept;
    cov[j * size] = cov[j]!;
  }
}

/** A copy with more states: the new one has mean 0 and the given variance. */
export function withState(h: Hypothesis, variance: number): Hypothesis {
  const size = h.mean.length;
  const mean = [...h.mean, 0];
  const cov = zeros((size + 1) * (size + 1));
  for (let i = 0; i < size; i++) for (let j = 0; j < size; j++) cov[i * (size + 1) + j] = h.cov[i * size + j]!;
  cov[(size + 1) * (size + 1) - 1] = variance;
  return { ...h, mean, cov };
}

/** Lets the state jump along `direction` by a Gaussian of the given variance; states added after its last one stay. */
export function loosen(h: Hypothesis, direction: ArrayLike<number>, variance: number): void {
  const size = h.mean.length;
  for (let i = 0; i < direction.length; i++)
    for (let j = 0; j < direction.length; j++) h.cov[i * size + j]! += variance * direction[i]! * direction[j]!;
}
