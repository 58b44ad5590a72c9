/** Learning the noise anew, and going through the past again with what was learned. */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { learnNoise } from '../filter/noiseLearning.ts';
import { withMargin } from '../filter/noiseMargin.ts';
import { newBank } from './bank.ts';
import { logWeightOf, pruned } from './beam.ts';
import { glitch } from './births.ts';
import { bestOf, countedArrivals, disturbances } from './counts.ts';
import { absorb, gapOf, type Hypothesis, loosen, predict, propagate, type Story } from './hypothesis.ts';
import { measure } from './measure.ts';
import { birthPlace } from './places.ts';
import { asFixed, type PulsarWatch } from './pulsarWatch.ts';
import { looseRecovery } from './recoveryStates.ts';
import { foundStartRate, shareOfCount, startBeam } from './start.ts';
import { stepAt } from './stepAt.ts';
import { observationOf } from './timeline.ts';
import type { Track } from './track.ts';

/** The noise is learned when the arrivals have grown by this factor. */
const LEARNING_GROWTH = 1.4;
/** An open question may hold learning back for so long. */
const PATIENCE = 1.4;
const SURE_SHARE = 0.95;
/** σ of a believed glitch when the past is gone through again: wide, its size is known from the arrivals. */
const BELIEVED_GLITCH_SIZE = 2e-5;
const BELIEVED_RATE_CHANGE = 0.2;
const SECONDS_PER_DAY = 86_400;

export function learningDue(watch: PulsarWatch, index: number): boolean {
  const count = index + 1;
  if (count < watch.nextLearning) return false;
  if (count >= PATIENCE * watch.nextLearning) return true;
  const best = watch.bank!.beam[0]!;
  const open = watch.tracks.some((t) => t.state === 'suspected' || (t.confirmedAt !== null && !t.settled));
  return !open && !best.lastSetAside && shareOfCount(watch.bank!, best) > SURE_SHARE;
}

export function relearn(watch: PulsarWatch, index: number): void {
  watch.nextLearning = Math.ceil((index + 1) * LEARNING_GROWTH);
  const best = bestOf(watch);
  const counted = withoutRecoveries(watch, countedArrivals(watch, best));
  const known = disturbances(watch);
  const learned = learnNoise(counted, known, watch.prior, watch.noise);
  watch.noise = asFixed(watch.model, withMargin(learned, counted, known, watch.prior));
  rebuild(watch, index, best, foundStartRate(counted));
}

/** Takes established recoveries off: the free step of an event covers what stays, not what decays. */
function withoutRecoveries(watch: PulsarWatch, counted: CountedArrival[]): CountedArrival[] {
  let left = counted;
  for (const track of watch.tracks) {
    if (track.state !== 'confirmed' || track.kind !== 'glitch') continue;
    const fit = measure(watch, track)?.glitch;
    if (!fit?.recovery) continue;
    const { bestEpochDays } = fit;
    const timescale = fit.recovery.timescaleDays.median;
    const turns = fit.recovery.frequencyStepHz.mean * SECONDS_PER_DAY * timescale;
    left = left.map((a) => {
      const since = a.tDays - bestEpochDays;
      return since <= 0 ? a : { ...a, deviationTurns: a.deviationTurns - turns * Math.expm1(-since / timescale) };
    });
  }
  return left;
}

/**
 * Goes through all arrivals again: up to the window with the count that has won, then with the whole bank. Nothing is
 * decided on the way.
 */
function rebuild(watch: PulsarWatch, index: number, best: Hypothesis, startRate: number): void {
  const decisions: Story[] = [];
  for (let s = best.story; s !== null; s = s.before) decisions[s.index] = s;
  const windowStart = Math.max(watch.oldestGap, index - watch.settings.windowArrivals + 1, 1);
  const beam = startBeam(watch, startRate);
  for (let i = 1; i < Math.min(windowStart, index + 1); i++) for (const b of beam) retrace(watch, b, decisions[i]!);
  // All start errors go on: how far the model's ν̇ was off may not be settled for a hundred arrivals.
  const at = { index: windowStart - 1, tDays: watch.line.seen[windowStart - 1]!.tDays };
  watch.bank = newBank(watch.noise, normalised(beam), at, watch.states.decays);
  for (let i = windowStart; i <= index; i++) stepAt(watch, i, watch.locked);
}

function normalised(beam: Hypothesis[]): Hypothesis[] {
  const kept = pruned(beam, beam.length);
  const total = logWeightOf(kept);
  for (const h of kept) h.logWeight -= total;
  return kept;
}

/** One arrival with its known count; a believed event sets its states free in the gap before it. */
function retrace(watch: PulsarWatch, h: Hypothesis, decision: Story): void {
  const { line, states, noise } = watch;
  const i = decision.index;
  const gapDays = line.seen[i]!.tDays - line.seen[i - 1]!.tDays;
  propagate(h, gapOf(gapDays, noise, states.decays));
  const mutable = h as { tracks: readonly number[] };
  for (const track of watch.tracks)
    if (track.bestGap === i && track.state === 'confirmed') {
      setFree(watch, h, track, gapDays);
      mutable.tracks = [...h.tracks, track.number];
    }
  const seen = observationOf(line, i, states, noise);
  h.story = { ...decision, before: h.story };
  h.lastSetAside = !decision.used;
  if (!decision.used) return;
  const { scratch } = watch.bank!;
  predict(h, seen.sight, scratch);
  const variance = scratch.variance + seen.variance;
  const innovation = seen.deviation + decision.turns - scratch.deviation;
  absorb(h, scratch, innovation, variance);
  h.logWeight -= 0.5 * ((innovation * innovation) / variance + Math.log(2 * Math.PI * variance));
}

function setFree(watch: PulsarWatch, h: Hypothesis, track: Track, gapDays: number): void {
  const place = birthPlace(watch, track.bestGap, gapDays);
  const nu = place.frequencyHz;
  if (track.kind === 'glitch') {
    glitch(h, BELIEVED_GLITCH_SIZE * nu * SECONDS_PER_DAY, place);
    looseRecovery(h, watch.states.decays, track.rateStep);
  } else if (track.kind === 'clock step') {
    for (const direction of place.offsetDirections) loosen(h, direction, 1);
  } else if (track.kind === 'dispersion step' && place.dispersionDirection !== null) {
    loosen(h, place.dispersionDirection, (0.3 * place.turnsPerDispersion) ** 2);
  }
  const size = h.mean.length;
  h.cov[2 * size + 2]! +=
    (BELIEVED_RATE_CHANGE * Math.abs(place.frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2) ** 2;
}
