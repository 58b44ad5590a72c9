/** Going through arrivals again whose whole turns are decided: one filter step each, no branching. */

import type { NoiseModel } from '../report.ts';
import { glitch, loseCount } from './births.ts';
import { absorb, gapOf, type Hypothesis, loosen, predict, propagate, type Story } from './hypothesis.ts';
import { birthPlace, clockVariance } from './places.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { looseRecovery, RECOVERY_SHARE } from './recoveryStates.ts';
import { observationOf } from './timeline.ts';
import { gapsOfEvent, type Rise, slowRise, type Track } from './track.ts';

/** σ of a believed glitch when the past is gone through again: wide, its size is known from the arrivals. */
const BELIEVED_GLITCH_SIZE = 2e-5;
const BELIEVED_RATE_CHANGE = 0.2;
/** The same of an event that is nothing else. */
const BELIEVED_RATE_CHANGE_ALONE = 1;
/** Share of its duration to which the begin and end of a slow rise are known. */
const RISE_DAYS_KNOWN_TO = 0.15;
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
    if (!gapsOfEvent(track).includes(i)) continue;
    setFree(watch, h, track, gapDays);
    if (!h.tracks.includes(track.number)) h.tracks = [...h.tracks, track.number];
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

/** The begin or the end of a slow rise: ν̇ changes, some days sooner or later. */
export function freeRise(h: Hypothesis, { stepTurns, days }: Rise, gapDays: number): void {
  changeSecond(h, stepTurns, Math.max(gapDays, RISE_DAYS_KNOWN_TO * days));
}

/** σ of a change of the second derivative, up to `days` sooner or later: what that did to ν and phase is free too. */
function changeSecond(h: Hypothesis, second: number, days: number): void {
  const size = h.mean.length;
  h.cov[2 * size + 2]! += second ** 2;
  h.cov[size + 1]! += (second * days) ** 2;
  h.cov[0]! += (second * days * days) ** 2 / 4;
}

function setFree(watch: PulsarWatch, h: Hypothesis, track: Track, gapDays: number): void {
  const rise = slowRise(track);
  if (rise !== null) {
    freeRise(h, rise, gapDays);
    return;
  }
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
  const { seen } = watch.line;
  const isChange = track.kind === 'spin-down-rate change';
  changeSecond(h, second, isChange ? seen[track.lastGap]!.tDays - seen[track.firstGap - 1]!.tDays : 0);
}
