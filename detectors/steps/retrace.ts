/** Going through arrivals again whose whole turns are decided: one filter step each, no branching. */

import type { NoiseModel } from '../report.ts';
import { glitch, loseCount } from './births.ts';
import { absorb, gapOf, type Hypothesis, loosen, predict, propagate, type Story } from './hypothesis.ts';
import { birthPlace, clockVariance } from './places.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { looseRecovery, RECOVERY_SHARE } from './recoveryStates.ts';
import { observationOf } from './timeline.ts';
import type { Track } from './track.ts';

/** σ of a believed glitch when the past is gone through again: wide, its size is known from the arrivals. */
const BELIEVED_GLITCH_SIZE = 2e-5;
const BELIEVED_RATE_CHANGE = 0.2;
/** The same of an event that is nothing else. */
const BELIEVED_RATE_CHANGE_ALONE = 1;
const SECONDS_PER_DAY = 86_400;

/** The noise, and the events held for true, under which the past is gone through. */
export interface Belief {
  readonly noise: NoiseModel;
  readonly tracks: readonly Track[];
}

/** What was decided of each arrival, by index. */
export function decisionsOf(h: Hypothesis): Story[] {
  const decisions: Story[] = [];
  for (let s = h.story; s !== null; s = s.before) decisions[s.index] = s;
  return decisions;
}

/** One arrival with its known count; a believed event sets its states free in the gap before it. */
export function retrace(watch: PulsarWatch, h: Hypothesis, decision: Story, { noise, tracks }: Belief): void {
  const { line, states } = watch;
  const i = decision.index;
  const gapDays = line.seen[i]!.tDays - line.seen[i - 1]!.tDays;
  propagate(h, gapOf(gapDays, noise, states.decays, clockVariance(watch, i)));
  for (const track of tracks) {
    if (track.bestGap !== i) continue;
    setFree(watch, h, track, gapDays);
    h.tracks = [...h.tracks, track.number];
  }
  takeIn(watch, h, decision, noise);
}

/** The arrival itself, with the whole turns that were decided. */
export function takeIn(watch: PulsarWatch, h: Hypothesis, decision: Story, noise: NoiseModel): void {
  const { line, states } = watch;
  const i = decision.index;
  const seen = observationOf(line, i, states, noise);
  h.story = { ...decision, before: h.story };
  h.lastSetAside = !decision.used;
  if (!decision.used) return;
  const { scratch } = watch.bank!;
  predict(h, seen.sight, scratch);
  const variance = scratch.variance + seen.variance;
  const innovation = seen.deviation + decision.turns - scratch.deviation;
  absorb(h, scratch, innovation, variance);
  if (seen.turnsToNumber !== null) h.numbering = decision.turns - seen.turnsToNumber;
  h.logWeight -= 0.5 * ((innovation * innovation) / variance + Math.log(2 * Math.PI * variance));
}

function setFree(watch: PulsarWatch, h: Hypothesis, track: Track, gapDays: number): void {
  const place = birthPlace(watch, track.bestGap, gapDays);
  const nu = place.frequencyHz;
  if (track.kind === 'glitch') {
    glitch(h, BELIEVED_GLITCH_SIZE * nu * SECONDS_PER_DAY, place);
    looseRecovery(h, watch.states.decays, RECOVERY_SHARE * track.rateStep);
  } else if (track.kind === 'lost count') {
    loseCount(h, place);
  } else if (track.kind === 'clock step') {
    for (const direction of place.offsetDirections) loosen(h, direction, 1);
  } else if (track.kind === 'dispersion step' && place.dispersionDirection !== null) {
    loosen(h, place.dispersionDirection, (0.3 * place.turnsPerDispersion) ** 2);
  }
  const share = track.kind === 'spin-down-rate change' ? BELIEVED_RATE_CHANGE_ALONE : BELIEVED_RATE_CHANGE;
  const second = share * Math.abs(place.frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2;
  const size = h.mean.length;
  h.cov[2 * size + 2]! += second ** 2;
  if (track.kind !== 'spin-down-rate change') return;
  // The change came up to so many days sooner or later than in this gap: what it did to ν and phase is free too.
  const days = watch.line.seen[track.lastGap]!.tDays - watch.line.seen[track.firstGap - 1]!.tDays;
  h.cov[size + 1]! += (second * days) ** 2;
  h.cov[0]! += (second * days * days) ** 2 / 4;
}
