import type { NoiseModel } from '../report.ts';
import type { CountedArrival, Disturbance } from './countedArrival.ts';
import { learningProblem, logLikelihood } from './noiseLikelihood.ts';
import type { NoisePrior } from './noisePrior.ts';

/** Natural-log units of posterior given up on the way to stronger noise: about one standard deviation. */
const GIVEN_UP = 0.5;
/** Up to the first number of sessions that much is given up, from the second on nothing. */
const FEW_SESSIONS = 150;
const MANY_SESSIONS = 300;
const STEP = 0.2;
/** e^6: no margin grows beyond this. */
const MOST_STEPS = 30;

/**
 * The most probable noise of few arrivals is too quiet as often as too loud, and too quiet makes false events. This is
 * the loudest noise that is still within one standard deviation: first of the walks in frequency and torque together,
 * then of scale and floor together. A walk that never showed would be made as loud as could have been overlooked, which hides small
 * glitches for months; with hundreds of sessions the noise is therefore taken as it was learned.
 */
export function withMargin(
  learned: NoiseModel,
  arrivals: readonly CountedArrival[],
  disturbances: readonly Disturbance[],
  prior: NoisePrior,
  sessions: number,
): NoiseModel {
  const nats = GIVEN_UP * Math.min(1, (MANY_SESSIONS - sessions) / (MANY_SESSIONS - FEW_SESSIONS));
  if (nats <= 0) return learned;
  const problem = learningProblem(arrivals, disturbances);
  const posterior = (noise: NoiseModel): number => {
    const walks =
      ((Math.log(noise.frequencyWalk / prior.frequencyWalk.median) / prior.frequencyWalk.lnScatter) ** 2 +
        (Math.log(noise.torqueWalk / prior.torqueWalk.median) / prior.torqueWalk.lnScatter) ** 2) /
      2;
    const scale = Math.log(noise.uncertaintyScale / prior.uncertaintyScale.median) / prior.uncertaintyScale.lnScatter;
    return logLikelihood(problem, noise) - walks - 0.5 * scale * scale;
  };
  const walksLouder = (noise: NoiseModel, factor: number): NoiseModel => ({
    ...noise,
    frequencyWalk: noise.frequencyWalk * factor,
    torqueWalk: noise.torqueWalk * factor,
  });
  const errorsLouder = (noise: NoiseModel, factor: number): NoiseModel => ({
    ...noise,
    uncertaintyScale: noise.uncertaintyScale * factor,
    floorTurns: noise.floorTurns * factor,
  });
  const level = posterior(learned) - nats;
  const walks = walksLouder(learned, loudest(learned, walksLouder, posterior, level, STEP));
  return errorsLouder(walks, loudest(learned, errorsLouder, posterior, level, STEP / 4));
}

function loudest(
  learned: NoiseModel,
  louder: (noise: NoiseModel, factor: number) => NoiseModel,
  posterior: (noise: NoiseModel) => number,
  level: number,
  step: number,
): number {
  let factor = 1;
  for (let k = 1; k <= MOST_STEPS; k++) {
    const next = Math.exp(k * step);
    if (posterior(louder(learned, next)) < level) break;
    factor = next;
  }
  return factor;
}
