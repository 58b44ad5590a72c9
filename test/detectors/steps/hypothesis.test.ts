import { describe, expect, it } from 'vitest';
import {
  absorb,
  gapOf,
  type Hypothesis,
  loosen,
  predict,
  propagate,
  sightOf,
  zeros,
} from '../../../detectors/steps/hypothesis.ts';
import { denseFit } from '../../support/denseLeastSquares.ts';
import { dice, observingDays, simulateWalk } from '../../support/simulatedPulsar.ts';

const LN_TWO_PI = Math.log(2 * Math.PI);

describe('a state that was added later', () => {
  it('stays as it is when the others are let go along a direction of before', () => {
    const h = { mean: [0, 0, 0, 1], cov: zeros(16), logWeight: 0 } as unknown as Hypothesis;
    h.cov[15] = 2;
    loosen(h, [1, 0, 1], 3);
    expect(h.cov).toEqual([3, 0, 3, 0, 0, 0, 0, 0, 3, 0, 3, 0, 0, 0, 0, 2]);
  });
});

describe('the filter of one hypothesis is generalised least squares', () => {
  it('agrees with the dense twin in log-likelihood and nuisances to 1e-8, over 60 random cases', () => {
    const random = dice(2026);
    let largest = 0;
    for (let k = 0; k < 60; k++) {
      const count = 10 + Math.floor(60 * random.uniform());
      const cadence = 0.5 * 40 ** random.uniform();
      const days = observingDays(count, cadence, 0.9, random);
      const sigma = 10 ** (-4 + 2 * random.uniform());
      const strength = () => sigma ** 2 * 10 ** (3 * random.uniform() - 2);
      const noise = {
        phaseWalk: strength() / cadence,
        frequencyWalk: strength() / cadence ** 3,
        torqueWalk: strength() / cadence ** 5,
        uncertaintyScale: 1,
        floorTurns: 0,
      };
      const second = days.map(() => (random.uniform() < 0.4 ? 1 : 0));
      const walk = simulateWalk(days, noise, random);
      const y = Float64Array.from(days, (_, i) => 0.2 + 0.1 * second[i]! + walk[i]! + sigma * random.normal());
      // As wide as a start model may be wrong and a receiver's offset unknown (detectors/steps/start.ts).
      const priorSd = [0.5, 1e-2, 3e-5, 0.3];
      const since = (i: number) => days[i]! - days[0]!;
      const columns = [
        Float64Array.from(days, () => 1),
        Float64Array.from(days, (_, i) => since(i)),
        Float64Array.from(days, (_, i) => since(i) ** 2 / 2),
        Float64Array.from(second),
      ];
      const dense = denseFit(
        days,
        days.map(() => sigma * sigma),
        noise,
        columns,
        y,
        priorSd,
      );

      const h: Hypothesis = {
        mean: zeros(4),
        cov: zeros(16),
        logWeight: 0,
        story: null,
        tracks: [],
        lastSetAside: false,
        numbering: null,
      };
      priorSd.forEach((sd, i) => {
        h.cov[5 * i] = sd * sd;
      });
      const scratch = { deviation: 0, variance: 0, gain: zeros(4), plain: true };
      let logLikelihood = 0;
      days.forEach((day, i) => {
        if (i > 0) propagate(h, gapOf(day - days[i - 1]!, noise, []));
        predict(h, sightOf([1, 0, 0, second[i]!]), scratch);
        const variance = scratch.variance + sigma * sigma;
        const innovation = y[i]! - scratch.deviation;
        // The dense twin leaves 2π out.
        logLikelihood -= 0.5 * (innovation ** 2 / variance + Math.log(variance) + LN_TWO_PI);
        absorb(h, scratch, innovation, variance);
      });
      logLikelihood += 0.5 * count * LN_TWO_PI;
      const sd = Math.sqrt(dense.covariance[15]!);
      largest = Math.max(
        largest,
        Math.abs(logLikelihood - dense.logLikelihood) / Math.max(1, Math.abs(dense.logLikelihood)),
        Math.abs(h.mean[3]! - dense.solution[3]!) / Math.max(sd, Math.abs(dense.solution[3]!)),
        Math.abs(Math.sqrt(h.cov[15]!) / sd - 1),
      );
    }
    console.log(`largest difference of a hypothesis from dense least squares: ${largest.toExponential(1)}`);
    expect(largest).toBeLessThan(1e-8);
  });
});
