/**
 * How well switches between two spin-down rates explain a whole record. Each hypothesis holds in which gaps the rate
 * switched; the difference of the two rates is a state like any other, so that it is one and the same at every switch.
 * A switching linear model, followed with the most probable chain of each latest switch (a Viterbi recursion).
 */

import { logAddExp } from '../math/logSumExp.ts';
import type { NoiseModel } from '../report.ts';
import { copyOf, gapOf, type Hypothesis, propagate, type Story, withState } from './hypothesis.ts';
import { clockVariance } from './places.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { retrace, takeIn } from './retrace.ts';
import { startBeam } from './start.ts';
import type { Track } from './track.ts';

/** What a record is gone through with: whole turns decided, and events held for true. */
export interface Past {
  readonly decisions: readonly Story[];
  readonly startRate: number;
  readonly tracks: readonly Track[];
}

/** Chains that agree in how many switches they have. */
export interface SwitchChains {
  /** ln P(arrivals | noise) over them. */
  readonly logEvidence: number;
  /** Arrivals (index) after the gaps in which the most probable one switches. */
  readonly switches: readonly number[];
  /** What its first switch adds to the second derivative of the deviation, turns/day²; negative as for a spin-up. */
  readonly stepTurns: number;
}

/** The second brings the rate back, as the end of a slow rise would; the third goes where the first went. */
const LEAST_SWITCHES = 3;
/** Switches come every few months to years (Lyne et al. 2010, Science 329, 408). */
export const SWITCHES_PER_YEAR = 1.5;
/** σ of Δν̇/ν̇ between the rates: 0.3 % to 45 % are published (Lyne et al. 2010, Table 1; from memory). */
const SIZES = [0.02, 0.2];
/** The rates themselves vary from one switch to the next by about this share of their difference. */
const DRIFT = 0.05;
/** The start model's errors are told apart by then, and a switch from them. */
const SETTLED_ARRIVALS = 20;
/** Chains that are followed: so many, within so many natural-log units of the best. */
const MOST_CHAINS = 50;
const REACH_NATS = 14;
/** The pulsar stays in one rate for so long at least (Lyne et al. 2010: months to years). */
const SHORTEST_STAY_DAYS = 30;
/** The same of a pulsar that has switched once: a slow rise looks like that too. */
const SHORTEST_RISE_DAYS = 10;
const DAYS_PER_YEAR = 365.25;
const SECONDS_PER_DAY = 86_400;

interface Switches {
  readonly gap: number;
  readonly tDays: number;
  readonly count: number;
  readonly before: Switches | null;
}

interface Chain {
  readonly h: Hypothesis;
  readonly switches: Switches | null;
  /** In the second of the two rates. */
  readonly second: boolean;
  /** Chains of one origin differ in their switches alone. */
  readonly origin: number;
}

/** The chains of at least `LEAST_SWITCHES`, and those of fewer. */
export function switchChains(
  watch: PulsarWatch,
  noise: NoiseModel,
  { decisions, startRate, tracks }: Past,
): { readonly many: SwitchChains; readonly few: SwitchChains } {
  const { seen } = watch.line;
  const belief = { noise, tracks };
  const eventful = new Set(tracks.map((t) => t.bestGap));
  let chains = firstChains(watch, startRate);
  for (let i = 1; i < seen.length; i++) {
    const gapDays = seen[i]!.tDays - seen[i - 1]!.tDays;
    const born = i < SETTLED_ARRIVALS || eventful.has(i) ? [] : switched(chains, i, seen[i]!.tDays, gapDays);
    const gap = gapOf(gapDays, noise, watch.states.decays, clockVariance(watch, i));
    for (const { h } of chains) retrace(watch, h, decisions[i]!, belief);
    for (const { h, second } of born) {
      propagate(h, gap);
      switchRate(h, second ? 1 : -1, gapDays);
      takeIn(watch, h, decisions[i]!, noise);
    }
    chains = followed([...chains, ...born], i);
  }
  const isEnough = ({ switches }: Chain) => switches !== null && switches.count >= LEAST_SWITCHES;
  return { many: summed(chains.filter(isEnough)), few: summed(chains.filter((chain) => !isEnough(chain))) };
}

function summed(chains: readonly Chain[]): SwitchChains {
  if (chains.length === 0) return { logEvidence: -Infinity, switches: [], stepTurns: 0 };
  const best = chains.reduce((a, b) => (b.h.logWeight > a.h.logWeight ? b : a));
  const switches: number[] = [];
  for (let s = best.switches; s !== null; s = s.before) switches.unshift(s.gap);
  const logEvidence = chains.reduce((sum, { h }) => logAddExp(sum, h.logWeight), -Infinity);
  return { logEvidence, switches, stepTurns: best.h.mean.at(-1)! };
}

/** ln P(arrivals | noise) without any switch. */
export function steadyEvidence(watch: PulsarWatch, noise: NoiseModel, { decisions, startRate, tracks }: Past): number {
  const beam = startBeam(watch, startRate);
  for (let i = 1; i < watch.line.seen.length; i++)
    for (const h of beam) retrace(watch, h, decisions[i]!, { noise, tracks });
  return beam.reduce((sum, h) => logAddExp(sum, h.logWeight), -Infinity);
}

function firstChains(watch: PulsarWatch, startRate: number): Chain[] {
  const spinDown = Math.abs(watch.model.spin.frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2;
  return startBeam(watch, startRate).flatMap((start, s) =>
    SIZES.map((size, k) => {
      const h = withState(start, (size * spinDown) ** 2);
      h.logWeight -= Math.log(SIZES.length);
      return { h, switches: null, second: false, origin: s * SIZES.length + k };
    }),
  );
}

/** The chains that switch in this gap; those that do not are made to pay for it. */
function switched(chains: readonly Chain[], gap: number, tDays: number, gapDays: number): Chain[] {
  const probability = Math.min(0.5, (SWITCHES_PER_YEAR * gapDays) / DAYS_PER_YEAR);
  return chains.flatMap(({ h, switches, second, origin }) => {
    const shortestDays = switches?.count === 1 ? SHORTEST_RISE_DAYS : SHORTEST_STAY_DAYS;
    if (switches !== null && tDays - switches.tDays < shortestDays) return [];
    const child = copyOf(h);
    child.logWeight += Math.log(probability);
    h.logWeight += Math.log1p(-probability);
    const latest = { gap, tDays, count: (switches?.count ?? 0) + 1, before: switches };
    return [{ h: child, switches: latest, second: !second, origin }];
  });
}

/**
 * The second derivative gains `sign` times the last state, somewhere in the gap that has just passed: on average half of
 * it long ago, with the scatter of a uniform moment.
 */
function switchRate(h: Hypothesis, sign: number, gapDays: number): void {
  const { mean, cov } = h;
  const size = mean.length;
  const at = size - 1;
  const half = gapDays / 2;
  const gains = [half ** 2 / 2 + gapDays ** 2 / 24, half, 1];
  const square = mean[at]! ** 2 + cov[at * size + at]!;
  for (let row = 0; row < gains.length; row++) {
    const gain = sign * gains[row]!;
    mean[row]! += gain * mean[at]!;
    for (let j = 0; j < size; j++) cov[row * size + j]! += gain * cov[at * size + j]!;
    for (let j = 0; j < size; j++) cov[j * size + row]! += gain * cov[j * size + at]!;
  }
  const late = (square * gapDays ** 2) / 12;
  cov[0]! += late * half ** 2;
  cov[1]! += late * half;
  cov[size]! += late * half;
  cov[size + 1]! += late;
  cov[2 * size + 2]! += DRIFT ** 2 * square;
}

/** One chain for each latest switch, the best of those that share it; then the heaviest. */
function followed(chains: readonly Chain[], index: number): Chain[] {
  const best = new Map<string, Chain>();
  for (const chain of chains) {
    const origin = index < SETTLED_ARRIVALS ? chain.origin : chain.origin % SIZES.length;
    const key = `${origin}|${chain.second}|${chain.switches?.gap ?? 0}`;
    const rival = best.get(key);
    if (rival === undefined) best.set(key, chain);
    else best.set(key, joined(rival, chain));
  }
  const sorted = [...best.values()].sort((a, b) => b.h.logWeight - a.h.logWeight);
  const floor = sorted[0]!.h.logWeight - REACH_NATS;
  return sorted.filter(({ h }, i) => i < MOST_CHAINS && h.logWeight >= floor);
}

function joined(a: Chain, b: Chain): Chain {
  const [heavier, lighter] = a.h.logWeight >= b.h.logWeight ? [a, b] : [b, a];
  heavier.h.logWeight = logAddExp(heavier.h.logWeight, lighter.h.logWeight);
  return heavier;
}
