/** A family: all hypotheses that say one kind of thing happened in one gap, as a beam of its own. */

import { type LastPage, logWeightOf, type Observation, observe, observeFirmly, pruned } from './beam.ts';
import type { Kind } from './births.ts';
import type { Hypothesis, Prediction } from './hypothesis.ts';

export interface Family {
  readonly kind: Kind;
  /** Index of the first arrival after the gap. */
  readonly gap: number;
  beam: Hypothesis[];
  /** Natural log of the weight of all of them. */
  logWeight: number;
  /**
   * It holds hypotheses that were not born in its gap but found by a search, and could not be made again: so many of them are
   * kept, and their counts may branch. 0: there are none.
   */
  readonly openSizes: number;
  /** Index of an arrival up to which it is carried, however light. */
  keptUntil: number;
}

/** A large glitch wraps within its first gaps: many counts must stay open. */
const YOUNG_BEAM: Readonly<Record<Kind, number>> = {
  glitch: 20,
  'spin-down-rate change': 4,
  'clock step': 6,
  'dispersion step': 4,
};
const OLD_BEAM: Readonly<Record<Kind, number>> = {
  glitch: 3,
  'spin-down-rate change': 2,
  'clock step': 2,
  'dispersion step': 2,
};
/** A gap is young for this many arrivals: its counts may still branch. */
export const YOUNG_ARRIVALS = 5;

export function newFamily(kind: Kind, gap: number, beam: Hypothesis[]): Family {
  return { kind, gap, beam, logWeight: logWeightOf(beam), openSizes: 0, keptUntil: 0 };
}

/** Takes one arrival into a family that has been carried to its time. */
export function observeFamily(family: Family, seen: Observation, scratch: Prediction, last: LastPage): void {
  const age = seen.index - family.gap;
  if (family.openSizes > 0) family.beam = observe(family.beam, seen, family.openSizes, scratch);
  else if (age < YOUNG_ARRIVALS) family.beam = observe(family.beam, seen, YOUNG_BEAM[family.kind], scratch);
  else observeFirmly(family.beam, seen, scratch, last);
  if (age === YOUNG_ARRIVALS && family.openSizes === 0) family.beam = pruned(family.beam, OLD_BEAM[family.kind]);
  family.logWeight = logWeightOf(family.beam);
}
