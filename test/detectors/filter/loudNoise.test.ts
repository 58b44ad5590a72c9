import { describe, expect, it } from 'vitest';
import { learnNoise, logNoisePrior } from '../../../detectors/filter/noiseLearning.ts';
import { learningProblem, logLikelihood } from '../../../detectors/filter/noiseLikelihood.ts';
import { noisePrior } from '../../../detectors/filter/noisePrior.ts';
import type { NoiseModel } from '../../../detectors/report.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

/** A likelihood's maximum lies at or above the truth, whatever the data: a descent into the wrong valley does not. */
describe('noise far louder than the population law expects', () => {
  const prior = noisePrior(5.7, -1e-14);
  const SIGMA = 4e-3;
  const cases = ['frequencyWalk', 'torqueWalk'].flatMap((walk) =>
    [1, 2, 3, 4].map((scatters) => ({ walk: walk as 'frequencyWalk' | 'torqueWalk', scatters })),
  );

  it.each(cases)('$walk, $scatters scatters above: no less probable than the truth', ({ walk, scatters }) => {
    for (let seed = 1; seed <= 3; seed++) {
      const random = dice(100 * seed + scatters);
      const { median, lnScatter } = prior[walk];
      const truth: NoiseModel = {
        phaseWalk: prior.phaseWalk.median * 1e-6,
        frequencyWalk: prior.frequencyWalk.median * 1e-6,
        torqueWalk: prior.torqueWalk.median * 1e-6,
        uncertaintyScale: 1,
        floorTurns: prior.floorOverSigma.median * SIGMA,
        [walk]: median * Math.exp(lnScatter * scatters),
      };
      const days = observingDays(70, 14, 0.6, random);
      const arrivals = simulateArrivals(days, truth, SIGMA, random);
      const problem = learningProblem(arrivals, []);
      // The two walks that are not there cost the truth nothing.
      const quiet = {
        phaseWalk: prior.phaseWalk.median,
        frequencyWalk: prior.frequencyWalk.median,
        torqueWalk: prior.torqueWalk.median,
      };
      const like = { ...truth, ...quiet, [walk]: truth[walk] };
      const posterior = (noise: NoiseModel) => logLikelihood(problem, noise) + logNoisePrior(noise, prior, SIGMA);
      expect(posterior(learnNoise(arrivals, [], prior))).toBeGreaterThan(posterior(like) - 0.5);
    }
  });
});
