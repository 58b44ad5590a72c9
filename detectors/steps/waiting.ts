/**
 * Families that wait. A family, once born, never meets the rest of the bank again: what it is after n arrivals follows from its
 * parents in the null, the gap, and those arrivals. So it need not be carried while nothing speaks for it. Its parents and
 * the arrivals since are kept, and when it is wanted it is made then, by the very steps it would have gone through: the same
 * states, counts and weights, to the last rounding of the common scale (`recall`).
 *
 * Whether it is wanted is told by its signature (signatures.ts), which is exact for one count of turns and no outliers, and
 * by those arrivals at which that does not hold: set aside twice in a row, or predicted too widely to tell turns apart.
 */

import { logAddExp } from '../math/logSumExp.ts';
import type { Observation } from './beam.ts';
import { type BirthPlace, born, KINDS, type Kind, logRateOfAny, widened } from './births.ts';
import { type Family, newFamily, observeFamily } from './family.ts';
import { copyOf, type Gap, type Hypothesis, type Prediction, propagate, withState } from './hypothesis.ts';
import { highestLogRatio, logBayesFactor, type Signatures } from './signatures.ts';
import { furtherDirections, type StepSize, stepSizes } from './stepSizes.ts';

/** A gap whose families can be made at any time. */
export interface WaitingGap {
  /** Index of the first arrival after the gap. */
  readonly index: number;
  place: BirthPlace;
  /** Null hypotheses after the gap, before its arrival. */
  parents: Hypothesis[];
  /** What all weights had been divided by, natural log. */
  readonly logScale: number;
  /** Orthonormal directions beyond the spin states that a step may take. */
  further: readonly (readonly number[])[];
  /** Made when first wanted. */
  sizes: ReadonlyMap<Kind, readonly StepSize[]> | null;
  /** Natural log of the rate of anything at all. */
  readonly logRate: number;
  /** Kinds that wait no more: they are carried by the bank, or have been dropped for good. */
  told: readonly Kind[];
  /** No family of it can weigh more against the null, natural log, than `ceiling` + (`gained` now − `gainedThen`). */
  ceiling: number;
  gainedThen: number;
}

/** One arrival of the past: all that a family needs to be taken through it. */
export interface Passage {
  readonly gap: Gap;
  seen: Observation;
  /** Natural log of the heaviest weight in the bank afterwards, on the scale of the first arrival. */
  heaviest: number;
}

/** A family this far below everything else is dropped for good. */
export const FAMILY_FLOOR_NATS = 18;
/** Null hypotheses within this of the heaviest become parents. */
const PARENT_NATS = 5;
const PARENTS = 3;

export function waitingGap(
  beam: readonly Hypothesis[],
  place: BirthPlace,
  index: number,
  logScale: number,
  gained: number,
): WaitingGap {
  const best = beam[0]!.logWeight;
  const parents: Hypothesis[] = [];
  for (let i = 0; i < beam.length && i < PARENTS; i++)
    if (beam[i]!.logWeight > best - PARENT_NATS) parents.push(copyOf(beam[i]!));
  const logRate = logRateOfAny(place);
  const further = furtherDirections(place);
  return {
    index,
    place,
    parents,
    logScale,
    further,
    sizes: null,
    logRate,
    told: NONE,
    ceiling: logRate,
    gainedThen: gained,
  };
}

const NONE: readonly Kind[] = [];

/** The same gap after a state was added to every hypothesis. */
export function withOneMoreState(gap: WaitingGap, variance: number): WaitingGap {
  return {
    ...gap,
    place: widened(gap.place),
    further: gap.further.map((direction) => [...direction, 0]),
    parents: gap.parents.map((h) => withState(h, variance)),
  };
}

/** An arrival before a state was known does not see it. */
export function passageWithOneMoreState(passage: Passage): Passage {
  const { seen } = passage;
  return { ...passage, seen: { ...seen, sight: { ...seen.sight, row: [...seen.sight.row, 0] } } };
}

/**
 * The family as it is now, on the scale `logScale`; null when there is none or it was dropped on the way.
 * `passages`: the arrivals from the gap's own on.
 */
export function recall(
  gap: WaitingGap,
  kind: Kind,
  passages: readonly Passage[],
  logScale: number,
  scratch: Prediction,
): Family | null {
  const beam = gap.parents.flatMap((parent) => born(kind, parent, gap.place));
  if (beam.length === 0) return null;
  const family = newFamily(kind, gap.index, beam);
  const last = { page: null };
  for (const { gap: between, seen, heaviest } of passages) {
    if (seen.index < gap.index) continue;
    if (seen.index > gap.index) for (const h of family.beam) propagate(h, between);
    observeFamily(family, seen, scratch, last);
    if (family.logWeight + gap.logScale < heaviest - FAMILY_FLOOR_NATS) return null;
  }
  const shift = gap.logScale - logScale;
  for (const h of family.beam) h.logWeight += shift;
  family.logWeight += shift;
  return family;
}

/** Natural-log weight of each waiting kind against the null by its signature, where it may be above `level`. */
export function kindsAbove(
  gap: WaitingGap,
  signatures: Signatures,
  position: number,
  level: number,
  gained: number,
): readonly Kind[] {
  if (gap.ceiling + gained - gap.gainedThen < level || gap.told.length === KINDS.length) return NONE;
  gap.gainedThen = gained;
  gap.ceiling = gap.logRate + highestLogRatio(signatures, position);
  if (gap.ceiling < level) return NONE;
  gap.ceiling = -Infinity;
  const above: Kind[] = [];
  for (const kind of KINDS) {
    if (gap.told.includes(kind)) continue;
    const weight = signatureWeight(gap, kind, signatures, position);
    if (weight > level) above.push(kind);
    gap.ceiling = Math.max(gap.ceiling, weight);
  }
  return above;
}

/** Natural log of the weight of the family against the null, by its signature. */
export function signatureWeight(gap: WaitingGap, kind: Kind, signatures: Signatures, position: number): number {
  gap.sizes ??= new Map(KINDS.map((k) => [k, stepSizes(k, gap.place, gap.further, signatures.states)]));
  let weight = -Infinity;
  for (const { logPrior, root } of gap.sizes.get(kind)!)
    weight = logAddExp(weight, logPrior + logBayesFactor(signatures, position, root));
  return weight;
}
