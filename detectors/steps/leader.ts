/**
 * The signatures follow the leader, the heaviest null hypothesis: its gains, its innovations, its count of turns. When
 * another takes the lead (an arrival that was set aside turns out to be good) the signatures are made anew along its story.
 */

import type { Observation } from './beam.ts';
import {
  absorb,
  copyOf,
  type Hypothesis,
  type Prediction,
  predict,
  propagate,
  type Story,
  zeros,
} from './hypothesis.ts';
import { absorbInto, addGap, carryOver, count, newSignatures, type Signatures, see, withRoom } from './signatures.ts';
import type { Passage, WaitingGap } from './waiting.ts';

export interface Leader {
  /** The leader's story up to the last arrival. */
  story: Story | null;
  signatures: Signatures;
  /**
   * Sum of e²/2S over the arrivals used: no family can have gained more on the leader, for its prediction is the wider one,
   * and its density nowhere rises above the peak of the leader's.
   */
  gained: number;
  /** What the leader expected of the arrival in hand. */
  readonly outlook: Prediction;
}

export function newLeader(h: Hypothesis): Leader {
  const states = h.mean.length;
  return { story: h.story, signatures: newSignatures(states), gained: 0, outlook: newPrediction(states) };
}

export function newPrediction(states: number): Prediction {
  return { deviation: 0, variance: 0, gain: zeros(states), plain: true };
}

export function withOneMoreStateSeen({ story, signatures, gained }: Leader): Leader {
  const states = signatures.states + 1;
  return {
    story,
    gained,
    signatures: withRoom(signatures, states, signatures.directions),
    outlook: newPrediction(states),
  };
}

export function enterGap(leader: Leader, gap: WaitingGap): void {
  leader.signatures = addGap(leader.signatures, gap.further);
}

/** Before the null takes the arrival in: what the leader, carried to it, and the signatures expect. */
export function lookAhead(leader: Leader, h: Hypothesis, seen: Observation): void {
  predict(h, seen.sight, leader.outlook);
  see(leader.signatures, seen.sight);
}

/** After it: true when the leader of before still leads, and the signatures have followed it. */
export function keepsLead(leader: Leader, h: Hypothesis, seen: Observation): boolean {
  if (h.story!.before !== leader.story) return false;
  leader.story = h.story;
  if (h.story!.used) take(leader, seen, h.story!.turns);
  return true;
}

function take(leader: Leader, seen: Observation, turns: number): void {
  const { outlook, signatures } = leader;
  const variance = outlook.variance + seen.variance;
  const innovation = seen.deviation + turns - outlook.deviation;
  count(signatures, innovation, variance);
  absorbInto(signatures, outlook, variance);
  leader.gained += (innovation * innovation) / (2 * variance);
}

/**
 * The signatures along the story of a new leader, from the oldest gap where its ancestor was a parent; returns how many of
 * the oldest gaps do not know it.
 */
export function followAnew(
  leader: Leader,
  h: Hypothesis,
  gaps: readonly WaitingGap[],
  passages: readonly Passage[],
): number {
  const { signatures } = leader;
  leader.signatures = newSignatures(signatures.states, signatures.directions, signatures.capacity);
  leader.story = h.story;
  leader.gained = 0;
  const story: Story[] = [];
  for (let s = h.story; s !== null && s.index >= gaps[0]!.index - 1; s = s.before) story[s.index] = s;
  const ancestorAt = (gap: WaitingGap) => gap.parents.find((p) => p.story === story[gap.index - 1]);
  const known = gaps.findIndex((gap) => ancestorAt(gap) !== undefined);
  const strangers = known < 0 ? gaps.length : known;
  for (let g = 0; g < strangers; g++) enterGap(leader, gaps[g]!);
  leader.signatures.errors.fill(0);
  if (known < 0) return strangers;
  const tracer = copyOf(ancestorAt(gaps[known]!)!);
  let next = known;
  for (const { gap, seen } of passages) {
    if (seen.index < gaps[known]!.index) continue;
    if (seen.index > gaps[known]!.index) {
      carryOver(leader.signatures, gap);
      propagate(tracer, gap);
    }
    if (gaps[next]?.index === seen.index) enterGap(leader, gaps[next++]!);
    lookAhead(leader, tracer, seen);
    const { used, turns } = story[seen.index]!;
    if (!used) continue;
    take(leader, seen, turns);
    const { outlook } = leader;
    absorb(tracer, outlook, seen.deviation + turns - outlook.deviation, outlook.variance + seen.variance);
  }
  return strangers;
}
