/** The first hypotheses of a pulsar: how far its start model may be off, and when one count has won. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { addState } from './bank.ts';
import { offsetUncertaintyS } from './declaredOffsets.ts';
import { type Hypothesis, zeros } from './hypothesis.ts';
import { turnsPerDispersion } from './places.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { shareOfCount } from './sameCount.ts';

/**
 * The start model's own error, as a mixture: share, σ of the rate (turns/day) and of its derivative (turns/day²). A model
 * fitted to a noisy first year can be off by a third of a turn over it.
 */
const START_ERRORS: readonly (readonly [share: number, rate: number, derivative: number])[] = [
  [0.5, 1e-4, 1e-7],
  [0.3, 1e-3, 3e-6],
  [0.2, 1e-2, 3e-5],
];
/** Where torque noise is strong, a model is off by what the noise does to a fit over about so long. */
const FITTED_DAYS = 100;
/** σ of an offset between receivers of which nothing is declared, turns: anything. */
const RECEIVER_OFFSET_TURNS = 0.3;
/** σ of the error of the start model's dispersion measure, pc cm⁻³. */
const DISPERSION_ERROR = 0.03;
/** Arrivals before a pulsar can be locked, spread (turns) of the prediction and share of the weight that lock it. */
const LOCK_ARRIVALS = 12;
const LOCK_SPREAD_TURNS = 0.1;
const LOCK_SHARE = 0.98;

/**
 * Hypotheses after the first arrival: the deviation is what it was seen to be; the model's rates may be wrong. `rate`
 * (turns/day) is what the search for a start model far off has found, if it had to.
 */
export function startBeam(watch: PulsarWatch, rate = 0): Hypothesis[] {
  const first = watch.line.seen[0]!;
  const size = watch.states.size;
  const variance = arrivalVariance(first.sigmaTurns, watch.noise);
  return startErrors(watch).map(([share, rateError, derivative]) => {
    const mean = zeros(size);
    mean[0] = first.deviation;
    mean[1] = rate;
    const cov = zeros(size * size);
    cov[0] = variance;
    cov[size + 1] = rateError * rateError;
    cov[2 * size + 2] = derivative * derivative;
    watch.states.offsets.forEach((at, group) => {
      if (at !== null) cov[at * size + at] = offsetError(watch, group) ** 2;
    });
    const { dispersion } = watch.states;
    if (dispersion !== null) cov[dispersion * size + dispersion] = dispersionError(watch) ** 2;
    const story = { index: 0, turns: 0, used: true, slipped: false, before: null };
    const number = first.arrival.pulseNumber;
    const numbering = number === null ? null : number - first.modelPulse;
    return { mean, cov, logWeight: Math.log(share), story, tracks: [], lastSetAside: false, numbering };
  });
}

/** The widest of the mixture is at least as wide as the pulsar's expected walk in frequency makes it. */
function startErrors({ prior }: PulsarWatch): typeof START_ERRORS {
  const walk = prior.frequencyWalk.median;
  return START_ERRORS.map(([share, rate, derivative], i) =>
    i < START_ERRORS.length - 1
      ? [share, rate, derivative]
      : [share, Math.max(rate, Math.sqrt(walk * FITTED_DAYS)), Math.max(derivative, Math.sqrt(walk / FITTED_DAYS))],
  );
}

/** A receiver or a band seen for the first time: one more state in every hypothesis. */
export function addNuisance(watch: PulsarWatch, what: 'offset' | 'dispersion'): void {
  const at = watch.states.size++;
  if (what === 'offset') watch.states.offsets.push(at);
  else watch.states.dispersion = at;
  const sigma = what === 'offset' ? offsetError(watch, watch.states.offsets.length - 1) : dispersionError(watch);
  watch.bank = addState(watch.bank!, sigma * sigma);
}

/** σ of what is not known of the offset of a group against the first one, turns. */
function offsetError({ model, line }: PulsarWatch, group: number): number {
  const place = (g: number) => line.seen.find((seen) => seen.group === g)!.arrival;
  const seconds = offsetUncertaintyS(model, place(group), place(0));
  return seconds === null ? RECEIVER_OFFSET_TURNS : seconds * model.spin.frequencyHz.hi;
}

function dispersionError(watch: PulsarWatch): number {
  return DISPERSION_ERROR * turnsPerDispersion(watch);
}

/** One count has won and predicts the next arrival to a fraction of a turn. */
export function canLock(watch: PulsarWatch, index: number): boolean {
  if (index + 1 < LOCK_ARRIVALS) return false;
  const [best] = watch.bank!.beam;
  if (best === undefined || Math.sqrt(best.cov[0]!) > LOCK_SPREAD_TURNS || best.lastSetAside) return false;
  return shareOfCount(watch, best) > LOCK_SHARE;
}

/** Rate (turns/day) of the first arrivals when it is beyond what start models are off by; else 0. */
export function foundStartRate(
  counted: readonly { readonly tDays: number; readonly deviationTurns: number; readonly used: boolean }[],
): number {
  const used = counted.filter((a) => a.used).slice(0, LOCK_ARRIVALS);
  const first = used[0];
  const last = used.at(-1);
  if (first === undefined || last === undefined || last.tDays === first.tDays) return 0;
  const rate = (last.deviationTurns - first.deviationTurns) / (last.tDays - first.tDays);
  const widest = Math.max(...START_ERRORS.map(([, error]) => error));
  return Math.abs(rate) > 3 * widest ? rate : 0;
}
