import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { CountedArrival, Disturbance } from '../../../detectors/filter/countedArrival.ts';
import { learnNoise } from '../../../detectors/filter/noiseLearning.ts';
import { noisePrior } from '../../../detectors/filter/noisePrior.ts';
import { fitGlitch } from '../../../detectors/recovery/glitchFit.ts';
import type { Estimate } from '../../../detectors/recovery/mixture.ts';
import { fitStep, type StepKind } from '../../../detectors/recovery/stepFit.ts';

const arrivals = fc
  .array(
    fc.record({
      gapDays: fc.oneof(fc.constant(0), fc.double({ min: 1e-4, max: 400, noNaN: true })),
      deviationTurns: fc.double({ min: -30, max: 30, noNaN: true }),
      sigmaTurns: fc.double({ min: 1e-6, max: 0.2, noNaN: true }),
      frequencyMhz: fc.constantFrom(350, 1400, Number.POSITIVE_INFINITY),
      group: fc.integer({ min: 0, max: 2 }),
      used: fc.boolean(),
    }),
    { minLength: 0, maxLength: 14 },
  )
  .map((rows): CountedArrival[] => {
    let tDays = 0;
    return rows.map(({ gapDays, ...rest }) => {
      tDays += gapDays;
      return { tDays, ...rest };
    });
  });

const disturbances = fc.array(
  fc.record({
    beforeIndex: fc.integer({ min: 0, max: 15 }),
    kind: fc.constantFrom('spin', 'phase', 'offset', 'dispersion'),
    group: fc.integer({ min: 0, max: 2 }),
  }),
  { maxLength: 3 },
) as fc.Arbitrary<Disturbance[]>;

function expectOrdered({ mean, median, sd, interval68, interval95 }: Estimate): void {
  for (const value of [mean, median, sd, ...interval68, ...interval95]) expect(value).not.toBeNaN();
  const ordered = [interval95[0], interval68[0], median, interval68[1], interval95[1]];
  const slack = 1e-6 * (ordered[4]! - ordered[0]!);
  for (let i = 1; i < 5; i++) expect(ordered[i]).toBeGreaterThanOrEqual(ordered[i - 1]! - slack);
}

describe('few, strange or degenerate arrivals', () => {
  const prior = noisePrior(4, -1e-14);

  it('give a noise model within its bounds', () => {
    fc.assert(
      fc.property(arrivals, disturbances, (list, events) => {
        const noise = learnNoise(list, events, prior);
        for (const value of Object.values(noise)) expect(value).toBeGreaterThanOrEqual(0);
        expect(noise.uncertaintyScale).toBeGreaterThanOrEqual(0.5);
        expect(noise.uncertaintyScale).toBeLessThanOrEqual(10);
        expect(Number.isFinite(noise.phaseWalk + noise.frequencyWalk + noise.torqueWalk + noise.floorTurns)).toBe(true);
      }),
      { seed: 91, numRuns: 150 },
    );
  });

  it('give ordered, finite intervals, or a clear refusal', () => {
    fc.assert(
      fc.property(
        arrivals,
        disturbances,
        fc.integer({ min: 0, max: 14 }),
        fc.constantFrom<StepKind>('time', 'dispersion', 'spin-down rate'),
        (list, events, gap, kind) => {
          const input = {
            arrivals: list,
            noise: { phaseWalk: 1e-9, frequencyWalk: 1e-12, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 1e-4 },
            firstGapBeforeIndex: gap,
            lastGapBeforeIndex: gap + 1,
            disturbances: events,
            frequencyHz: 4,
            frequencyDerivativeHzPerS: -1e-14,
          };
          try {
            const fit = fitGlitch(input);
            for (const estimate of [fit.epochDays, fit.deltaNuHz, fit.deltaNuDotHzPerS]) expectOrdered(estimate);
            expect(Number.isFinite(fit.logEvidence)).toBe(true);
            expectOrdered(fitStep({ ...input, kind }).size);
          } catch (error) {
            if (!(error instanceof RangeError)) throw error;
            expect(error.message).toMatch(/no gap between arrivals in use/);
          }
        },
      ),
      { seed: 92, numRuns: 150 },
    );
  });
});
