/**
 * Event or noise: both sides get the noise that suits them best. The bank weighs an event under noise learned before it; noise
 * that was learned too quiet would make event after event, and each, once believed, would hide the noise. So before an
 * event is confirmed the whole record is gone through twice: as noise alone, and as noise with the event.
 *
 * The wide prior on the noise lets one step pass for noise that was never seen before, however clear the step: the stretches of
 * the record that are as long as the step has been seen are few, and their scatter is known no better than a handful of
 * numbers tells it. The longer the record before a glitch, the less that excuse is worth.
 */

import { learnNoise, logNoisePrior } from '../filter/noiseLearning.ts';
import type { NoiseModel } from '../report.ts';
import { logWeightOf } from './beam.ts';
import { born } from './births.ts';
import { countedArrivals, disturbances, freedGaps } from './counts.ts';
import { withoutRecoveries } from './establishedRecoveries.ts';
import { gapOf, type Hypothesis, propagate, type Story } from './hypothesis.ts';
import { birthPlace, clockVariance } from './places.ts';
import { asFixed, type PulsarWatch } from './pulsarWatch.ts';
import { looseRecovery, RECOVERY_SHARE } from './recoveryStates.ts';
import { decisionsOf, freeRise, retrace, takeIn } from './retrace.ts';
import { LOG_RISE_PRIOR } from './slowSpinUp.ts';
import { foundStartRate, startBeam } from './start.ts';
import { sessionsUntil } from './timeline.ts';
import { gapsOfEvent, type Rise, slowRise, type Track } from './track.ts';

/** Sessions before an event from which on they tell what the noise is. */
const TELLING_SESSIONS = 60;
/** With so many, noise must not be the better explanation; with every doubling it may be so by some nats more. */
const EVEN_SESSIONS = 100;
const NATS_PER_DOUBLING = 2;
const MOST_NATS = 8;

/**
 * Natural-log joint odds that leave the decision to the bank's own; infinite where both must pass the threshold. Found on simulated
 * pulsars of the population (`test/studies/secondWeighing.ts`). Changes of ν̇ are what noise in the torque looks like, at
 * whatever length of record.
 */
export function leastJointOdds({ line }: PulsarWatch, { kind, bestGap }: Pick<Track, 'kind' | 'bestGap'>): number {
  const sessions = sessionsUntil(line, bestGap - 1);
  if (kind !== 'glitch' || sessions < TELLING_SESSIONS) return Number.POSITIVE_INFINITY;
  const nats = Math.floor(NATS_PER_DOUBLING * Math.log2(sessions / EVEN_SESSIONS));
  return -Math.min(MOST_NATS, Math.max(0, nats));
}

/**
 * Natural log of (this event and noise) against (noise alone), prior rates included. `h`: the heaviest hypothesis that holds
 * the event for true; its counts are used on both sides.
 */
export function jointOdds(watch: PulsarWatch, track: Track, h: Hypothesis): number {
  const counted = withoutRecoveries(watch, countedArrivals(watch, h));
  const others = disturbances(watch, track);
  const own = freedGaps(watch, track);
  const learn = (known: typeof others) => asFixed(watch.model, learnNoise(counted, known, watch.prior, watch.noise));
  const sigmas = counted
    .filter((a) => a.used)
    .map((a) => a.sigmaTurns)
    .sort((a, b) => a - b);
  const medianSigma = sigmas[sigmas.length >> 1]!;
  const decisions = decisionsOf(h);
  const startRate = foundStartRate(counted);
  const posterior = (noise: NoiseModel, event: Track | null) =>
    logEvidence(watch, decisions, noise, { event, startRate, except: track }) +
    logNoisePrior(noise, watch.prior, medianSigma);
  const alone = learn(others);
  // Noise learned with the event's states quite free may be too quiet for an event of any size that is expected.
  const withEvent = Math.max(posterior(learn([...others, ...own]), track), posterior(alone, track));
  return withEvent - posterior(alone, null);
}

/** ln P(arrivals | noise, events): with `event`, its sizes as a mixture by prior rate, in the gaps that it may lie in. */
function logEvidence(
  watch: PulsarWatch,
  decisions: readonly Story[],
  noise: NoiseModel,
  given: { readonly event: Track | null; readonly except: Track; readonly startRate: number },
): number {
  const belief = { noise, tracks: watch.tracks.filter((t) => t.state === 'confirmed' && t !== given.except) };
  let beam = startBeam(watch, given.startRate);
  for (let i = 1; i < watch.line.seen.length; i++) {
    const decision = decisions[i]!;
    if (given.event === null || !gapsOfEvent(given.event).includes(i)) {
      for (const h of beam) retrace(watch, h, decision, belief);
      continue;
    }
    const gapDays = watch.line.seen[i]!.tDays - watch.line.seen[i - 1]!.tDays;
    const place = { ...birthPlace(watch, i, gapDays), countKnown: true };
    const gap = gapOf(gapDays, noise, watch.states.decays, clockVariance(watch, i));
    for (const h of beam) propagate(h, gap);
    const { kind, rateStep } = given.event;
    const rise = slowRise(given.event);
    if (rise !== null) for (const h of beam) riseBegins(h, rise, i, gapDays);
    else beam = beam.flatMap((h) => born(kind, h, place));
    if (kind === 'glitch' && rise === null)
      for (const h of beam) looseRecovery(h, watch.states.decays, RECOVERY_SHARE * rateStep);
    for (const h of beam) takeIn(watch, h, decision, noise);
  }
  return logWeightOf(beam) + (given.event === null || slowRise(given.event) !== null ? 0 : given.event.logPlaces);
}

/** The begin of a slow rise at its prior rate; its end, of which the size is known, at none. */
function riseBegins(h: Hypothesis, rise: Rise, index: number, gapDays: number): void {
  if (index === rise.firstGap) h.logWeight += LOG_RISE_PRIOR;
  freeRise(h, rise, gapDays);
}
