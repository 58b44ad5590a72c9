import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { Programme } from '../../../detectors/limits/programme.ts';
import { drawNoise, rehearse, type Stage } from '../../../detectors/limits/rehearsal.ts';
import { at, something } from '../../../detectors/limits/weighing.ts';
import type { NoiseModel } from '../../../detectors/report.ts';

const SIGMA = 1e-3;
const WHITE: NoiseModel = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 };

/** One arrival before the step, `count` after it, a fixed time apart. */
function programmeOf(count: number, everyDays: number): Programme {
  const arrivals = Array.from({ length: count + 1 }, (_, i) => ({
    tDays: i * everyDays,
    deviationTurns: 0,
    sigmaTurns: SIGMA,
    frequencyMhz: 1400,
    group: 0,
    used: true,
  }));
  return { arrivals, firstAhead: 1, pastWeight: 1 };
}

function stageOf(programme: Programme, draws: number, priorSd = [0, 0, 0]): Stage {
  const looks = [programme.arrivals.length - 1];
  return {
    programme,
    offsets: [0],
    gaps: [1],
    looks,
    draws,
    noiseOnly: drawNoise(
      programme,
      Array.from({ length: draws / 2 }, () => WHITE),
    ),
    priorSd,
  };
}

describe('the signatures of a step', () => {
  test('give the variance of a fitted slope, in white noise and with the past known: 12 σ² / (n (n² − 1) Δt²)', () => {
    // Textbook result for a straight line through n equidistant points (e.g. Bevington & Robinson, Data Reduction, chapter 6).
    fc.assert(
      fc.property(fc.integer({ min: 3, max: 90 }), fc.double({ min: 0.5, max: 20, noNaN: true }), (n, everyDays) => {
        const [sums] = rehearse(stageOf(programmeOf(n, everyDays), 2), WHITE);
        const [i00, i01, , , i11] = sums!.own[0]! as unknown as number[];
        const variance = 1 / (i11! - i01! ** 2 / i00!);
        const expected = (12 * SIGMA ** 2) / (n * (n ** 2 - 1) * everyDays ** 2);
        expect(variance / expected).toBeCloseTo(1, 8);
      }),
    );
  });

  test('of a true step make twice the log Bayes factor non-central χ²', () => {
    // Quantiles from scipy: test/data/limits/make-noncentral.py.
    interface Case {
      readonly degrees: number;
      readonly noncentrality: number;
      readonly quantiles: Readonly<Record<string, number>>;
    }
    const file = new URL('../../data/limits/noncentral.json', import.meta.url);
    const cases = JSON.parse(readFileSync(file, 'utf8')) as Case[];
    const draws = 20_000;
    const [sums] = rehearse(stageOf(programmeOf(12, 3), draws), WHITE);
    const lags = new Float64Array(draws);
    const rateInformation = sums!.own[0]![4]!;
    // A prior much wider than what is measured, in so many directions.
    const wide = [1e6, 1e6, 1e4];
    for (const { degrees, noncentrality, quantiles } of cases) {
      const free = degrees === 1 ? [1] : degrees === 2 ? [0, 1] : [0, 1, 2];
      const covariance = Array.from({ length: 9 }, (_, i) => (i % 4 === 0 && free.includes(i / 4) ? wide[i / 4]! : 0));
      const delta = Math.sqrt(noncentrality / rateInformation);
      const parabolas = something(sums!, 0, { logWeight: 0, covariance }, lags);
      const still = { ...sums!, projections: sums!.projections.map((p) => p.map(() => 0)) };
      const level = at(something(still, 0, { logWeight: 0, covariance }, lags), 0, 0);
      const found = Array.from({ length: draws }, (_, m) => 2 * (at(parabolas, m, delta) - level)).sort(
        (a, b) => a - b,
      );
      for (const [p, quantile] of Object.entries(quantiles)) {
        const below = found.filter((x) => x < quantile).length / draws;
        expect(Math.abs(below - Number(p))).toBeLessThan(0.012);
      }
    }
  });

  test('draws have the variance of the noise they stand for', () => {
    const programme = programmeOf(20, 5);
    const noise = { ...WHITE, frequencyWalk: 1e-9 };
    const values = drawNoise(
      programme,
      Array.from({ length: 2000 }, () => noise),
    );
    // Random walk in frequency: variance q t³/3 of the phase.
    const t = programme.arrivals.at(-1)!.tDays;
    const expected = (1e-9 * t ** 3) / 3 + SIGMA ** 2;
    const variance = values.at(-1)!.reduce((sum, v) => sum + v * v, 0) / 4000;
    expect(Math.abs(variance / expected - 1)).toBeLessThan(0.1);
  });
});
