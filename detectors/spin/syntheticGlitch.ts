import type { TimedArrival } from '../arrival.ts';
import { addSeconds } from '../time/mjd.ts';
import { toNumber } from './doubleDouble.ts';
import type { KnownGlitch, PulsarModel } from './pulsarModel.ts';
import { glitchPhase, phaseEvaluator, secondsBetween } from './spinDownModel.ts';

/**
 * Arrivals as they would have been, had the pulsar glitched: the turns that the glitch adds make the pulses early. The time at which
 * the phase is met again is found by iteration, since the glitch itself goes on while the pulse comes forward.
 */
export function withGlitch(arrivals: readonly TimedArrival[], model: PulsarModel, glitch: KnownGlitch): TimedArrival[] {
  const phaseAt = phaseEvaluator(model);
  return arrivals.map((arrival) => {
    const since = toNumber(secondsBetween(arrival.tdb, glitch.epochTdb));
    if (since <= 0) return arrival;
    const { frequencyHz } = phaseAt(arrival.tdb);
    let early = 0;
    for (let round = 0; round < ROUNDS; round++) early = glitchPhase(glitch, Math.max(0, since - early)) / frequencyHz;
    return { ...arrival, tdb: addSeconds(arrival.tdb, -early) };
  });
}

/** Each round gains a factor of Δν/ν, at most 1e-4. */
const ROUNDS = 3;
