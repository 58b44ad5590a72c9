/** The size that is confirmed with 90 % probability, against the time that it takes. */

import { nuisanceLayout } from '../filter/nuisance.ts';
import { normalQuantile } from '../math/normal.ts';
import { leastJointOdds } from '../steps/jointOdds.ts';
import { turnsPerDispersion } from '../steps/places.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { SESSION_DAYS } from '../steps/timeline.ts';
import type { Programme } from './programme.ts';
import { drawNoise, rehearse, type Stage, type Sums } from './rehearsal.ts';
import { sizePriors } from './sizePriors.ts';
import { bankExcess, type Excess, gapDaysBefore, jointExcess, louder, OFFSETS, trialsOf } from './thresholds.ts';
import { something, total } from './weighing.ts';

export interface LimitAfter {
  /** From the epoch to the arrival that confirms. */
  readonly delayDays: number;
  readonly deltaNuOverNu90: number;
}

const DRAWS = 24;
const LOOKS = 8;
/** z of the normal distribution with 90 % below it. */
const Z_90 = 1.2815515655446004;
/**
 * The true noise of the draws scatters about the learned one by so many margins (`filter/noiseMargin.ts`): the margin is one standard
 * deviation along one direction of five. Found on injected glitches (`test/studies/limits.ts`).
 */
const NOISE_SCATTER = 2.5;
const SECONDS_PER_DAY = 86_400;
const LARGEST_RATE_STEP = 10;
const SMALLEST_RATE_STEP = 1e-14;

/** Earliest first; empty when no second session lies ahead. */
export function limitCurve(watch: PulsarWatch, programme: Programme): LimitAfter[] {
  const { arrivals, firstAhead } = programme;
  const looks = looksOf(programme);
  if (looks.length === 0) return [];
  const offsets = OFFSETS.map(([offset]) => offset).filter(
    (offset) => firstAhead + offset > 1 && firstAhead + offset < arrivals.length,
  );
  const stage: Stage = {
    programme,
    offsets,
    gaps: offsets.map((offset) => firstAhead + offset),
    // Two more, before and after the first arrival: from there on arrivals may be set aside.
    looks: [firstAhead - 1, firstAhead, ...looks],
    draws: DRAWS,
    noiseOnly: drawNoise(
      programme,
      quantiles(DRAWS / 2, 7).map((p) => louder(watch, NOISE_SCATTER * normalQuantile(p))),
    ),
    priorSd: priorSd(watch, programme),
  };
  const gapDays = gapDaysBefore(programme, firstAhead);
  const half = quantiles(DRAWS / 2, 1).map((p) => gapDays * p);
  const lags = Float64Array.from([...half, ...half]);
  const decided = rehearse(stage, watch.noise);
  const bank = bankExcess(watch, stage, decided, lags);
  const next = { kind: 'glitch', bestGap: watch.line.seen.length } as const;
  const guesses = decided.map((sums) => withoutNoise(watch, sums, gapDays));
  const trials = trialsOf(watch, stage, guesses.at(-1)!);
  const leastJoint = leastJointOdds(watch, next);
  const eased = Number.isFinite(leastJoint) ? watch.settings.confirmLogOdds - leastJoint : 0;
  const least = new Float64Array(DRAWS).fill(Number.POSITIVE_INFINITY);
  let smallest = Number.POSITIVE_INFINITY;
  return looks.map((look, i) => {
    const l = i + 2;
    const about = guesses[l]!;
    const ofBank = bank(l, about);
    const ofJoint = jointExcess(watch, stage, trials, l, lags, about);
    const excess: Excess = (m, delta) => {
      const joint = ofJoint(m, delta) + ofBank.logPlaces(m, delta) + eased;
      return joint < 0 ? joint : ofBank.excess(m, delta);
    };
    for (let m = 0; m < DRAWS; m++) least[m] = Math.min(least[m]!, crossing(excess, m, about));
    // More arrivals take nothing away: what was confirmed sooner stays so.
    smallest = Math.min(smallest, quantile90(least));
    return {
      delayDays: arrivals[look]!.tDays - arrivals[firstAhead]!.tDays + gapDays / 2,
      deltaNuOverNu90: smallest / (watch.model.spin.frequencyHz.hi * SECONDS_PER_DAY),
    };
  });
}

/** The middles of `count` equal shares, in an order that goes round by `stride`: two orders make two quantities independent. */
function quantiles(count: number, stride: number): number[] {
  return Array.from({ length: count }, (_, m) => (((m * stride) % count) + 0.5) / count);
}

/** Arrivals after which is weighed: evenly in the logarithm, from the second session on. */
function looksOf({ arrivals, firstAhead }: Programme): number[] {
  const second = arrivals.findIndex((a, i) => i > firstAhead && a.tDays - arrivals[i - 1]!.tDays >= SESSION_DAYS);
  if (second < 0) return [];
  const from = second - firstAhead + 1;
  const to = arrivals.length - firstAhead;
  const counts = Array.from({ length: LOOKS }, (_, k) => Math.round(from * (to / from) ** (k / (LOOKS - 1))));
  return [...new Set(counts)].map((count) => firstAhead + count - 1);
}

/** What the detector knows of a pulsar whose model is right (`steps/start.ts`). */
function priorSd(watch: PulsarWatch, { arrivals }: Programme): number[] {
  const layout = nuisanceLayout(arrivals);
  const sd = [1, 1e-4, 1e-7, ...new Array<number>(layout.size - 3).fill(0.3)];
  if (layout.dispersionState !== null) sd[layout.dispersionState] = 0.03 * turnsPerDispersion(watch);
  return sd;
}

/** The rate step (turns/day) that the bank would just confirm if noise neither helped nor harmed. */
function withoutNoise(watch: PulsarWatch, sums: Sums, gapDays: number): number {
  const lag = Float64Array.of(gapDays / 2);
  const still = { ...sums, projections: sums.projections.map(() => [0]) };
  const terms = sizePriors(watch, 'glitch', gapDays).map((prior) => something(still, 0, prior, lag));
  let low = SMALLEST_RATE_STEP;
  let high = LARGEST_RATE_STEP;
  while (high > 1.01 * low) {
    const middle = Math.sqrt(low * high);
    if (total(terms, 0, middle) < watch.settings.confirmLogOdds) low = middle;
    else high = middle;
  }
  return high;
}

/** The least rate step that passes in draw `m`; infinite when none of any likely size does. */
function crossing(excess: Excess, m: number, about: number): number {
  let low = about / 3;
  let high = low;
  do {
    low = high;
    high *= 2;
    if (high > 100 * about) return Number.POSITIVE_INFINITY;
  } while (excess(m, high) < 0);
  for (let k = 0; k < 6; k++) {
    const middle = Math.sqrt(low * high);
    if (excess(m, middle) < 0) low = middle;
    else high = middle;
  }
  return Math.sqrt(low * high);
}

/** Of a log-normal through the draws, which is smoother than counting them; counted where some are never confirmed. */
function quantile90(sizes: Float64Array): number {
  if (sizes.some((size) => !Number.isFinite(size)))
    return [...sizes].sort((a, b) => a - b)[Math.floor(0.9 * sizes.length)]!;
  const logs = Array.from(sizes, Math.log);
  const mean = logs.reduce((sum, log) => sum + log, 0) / logs.length;
  const variance = logs.reduce((sum, log) => sum + (log - mean) ** 2, 0) / logs.length;
  return Math.exp(mean + Z_90 * Math.sqrt(variance));
}
