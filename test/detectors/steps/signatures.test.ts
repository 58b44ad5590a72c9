import { describe, expect, it } from 'vitest';
import {
  absorb,
  copyOf,
  gapOf,
  type Hypothesis,
  loosen,
  predict,
  propagate,
  sightOf,
  zeros,
} from '../../../detectors/steps/hypothesis.ts';
import {
  absorbInto,
  addGap,
  carryOver,
  count,
  highestLogRatio,
  logBayesFactor,
  newSignatures,
  see,
  withRoom,
} from '../../../detectors/steps/signatures.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';

// Willsky & Jones 1976 prove it on paper; here a filter that is told of the step is run beside one that is not.

const STATES = 4;
const ARRIVALS = 70;

describe('signatures of steps', () => {
  it('give the Bayes factor of a filter that takes the step, for every gap, to 1e-7', () => {
    const random = dice(77);
    let worst = 0;
    for (let trial = 0; trial < 20; trial++) {
      const cadence = 10 ** (2 * random.uniform() - 0.5);
      const days = observingDays(ARRIVALS, cadence, 0.9, random);
      const sigma = 1e-3;
      const noise = {
        phaseWalk: 0,
        frequencyWalk: sigma ** 2 / cadence ** 3 / 30,
        torqueWalk: sigma ** 2 / cadence ** 5 / 1e4,
        uncertaintyScale: 1,
        floorTurns: 0,
      };
      const quiet = startOf([0.5, 0.1 / cadence, 0.01 / cadence ** 2, 0.3]);
      // The step of a gap: both of its columns at once, one along a receiver's offset too.
      const columns = [
        [0.4 * sigma, 0.3 * sigma, sigma / cadence, 0],
        [0, 0, 0.1 * (sigma / cadence), 2 * sigma],
      ];
      const steps: { readonly h: Hypothesis; log: number }[] = [];
      let signatures = newSignatures(STATES);
      let quietLog = 0;
      const outlook = { deviation: 0, variance: 0, gain: zeros(STATES), plain: true };
      const take = (h: Hypothesis, sight: ReturnType<typeof sightOf>, y: number): number => {
        predict(h, sight, outlook);
        const variance = outlook.variance + sigma * sigma;
        const innovation = y - outlook.deviation;
        absorb(h, outlook, innovation, variance);
        return -0.5 * (innovation ** 2 / variance + Math.log(variance));
      };
      days.forEach((day, i) => {
        const gap = gapOf(i === 0 ? 0 : day - days[i - 1]!, noise, []);
        for (const h of [quiet, ...steps.map((s) => s.h)]) propagate(h, gap);
        carryOver(signatures, gap);
        if (i > 0 && i % 3 === 0) {
          const h = copyOf(quiet);
          for (const column of columns) loosen(h, column, 1);
          steps.push({ h, log: quietLog });
          signatures = addGap(signatures, [[0, 0, 0, 1]]);
        }
        const sight = sightOf([1, 0, 0, random.uniform() < 0.4 ? 1 : 0]);
        const y = 4 * sigma * random.normal();
        predict(quiet, sight, outlook);
        const variance = outlook.variance + sigma * sigma;
        see(signatures, sight);
        count(signatures, y - outlook.deviation, variance);
        absorbInto(signatures, outlook, variance);
        quietLog += take(quiet, sight, y);
        for (const step of steps) step.log += take(step.h, sight, y);
        // Moving house must not lose anything.
        if (i === 40) signatures = withRoom(signatures, STATES, signatures.directions, 48);
      });
      const root = { rank: 2, directions: 4, columns: Float64Array.from(columns.flat()) };
      steps.forEach(({ log }, position) => {
        const bySignature = logBayesFactor(signatures, position, root);
        worst = Math.max(worst, Math.abs(bySignature - (log - quietLog)) / Math.max(1, Math.abs(log - quietLog)));
        expect(bySignature).toBeLessThan(highestLogRatio(signatures, position) + 1e-6);
      });
      expect(steps.length).toBeGreaterThan(20);
    }
    console.log(`largest difference of a signature from a filter with the step: ${worst.toExponential(1)}`);
    expect(worst).toBeLessThan(1e-7);
  });
});

function startOf(sd: readonly number[]): Hypothesis {
  const cov = zeros(STATES * STATES);
  sd.forEach((s, i) => {
    cov[i * (STATES + 1)] = s * s;
  });
  return { mean: zeros(STATES), cov, logWeight: 0, story: null, tracks: [], lastSetAside: false, numbering: null };
}
