import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { commonStep, type Witness } from '../../../detectors/site/commonStep.ts';

/** The same integral by brute force: densities as they are defined, summed over a fine grid of steps (rectangle rule), size by size. */
function logBayesFactorByGrid(witnesses: readonly Witness[]): number {
  const sizes = [
    [0.35, 3e-5],
    [0.35, 1e-3],
    [0.3, 1],
  ] as const;
  const normal = (x: number, v: number) => Math.exp((-0.5 * x * x) / v) / Math.sqrt(2 * Math.PI * v);
  const wrapped = (x: number, v: number) => {
    let sum = 0;
    const centre = x - Math.round(x);
    for (let k = -2; k <= 2; k++) sum += normal(centre + k, v);
    return sum;
  };
  const density = ({ frequencyHz: nu, turns, variance, lasts, gapDays }: Witness, step: number) => {
    const bad = lasts ? 0.0004 : 0.02;
    const own = (0.1 * gapDays) / 365.25;
    const off = turns - step * nu;
    const strange = sizes.reduce(
      (s, [share, sd]) => s + share * wrapped(off, variance + Math.min(sd * nu, 0.3) ** 2),
      0,
    );
    return (1 - bad - own) * wrapped(off, variance) + bad + own * strange;
  };
  let sum = 0;
  for (const [share, sd] of sizes) {
    const grid = Math.min(sd / 20, 4e-4);
    for (let step = -5 * sd; step <= 5 * sd; step += grid)
      sum += grid * share * normal(step, sd * sd) * witnesses.reduce((product, w) => product * density(w, step), 1);
  }
  return Math.log(sum) - witnesses.reduce((s, w) => s + Math.log(density(w, 0)), 0);
}

describe('a step common to several pulsars', () => {
  it('has the Bayes factor that the integral over its size gives', () => {
    const witness = fc.record({
      frequencyHz: fc.double({ min: 0.5, max: 4, noNaN: true }),
      turns: fc.double({ min: -0.5, max: 0.5, noNaN: true }),
      variance: fc.double({ min: 2e-3, max: 3e-2, noNaN: true }).map((sigma) => sigma * sigma),
      gapDays: fc.double({ min: 0.5, max: 20, noNaN: true }),
      lasts: fc.boolean(),
    });
    fc.assert(
      fc.property(fc.array(witness, { minLength: 2, maxLength: 3 }), (witnesses) => {
        expect(Math.abs(commonStep(witnesses).logBayesFactor - logBayesFactorByGrid(witnesses))).toBeLessThan(0.1);
      }),
      { numRuns: 3, seed: 4 },
    );
  });
});
