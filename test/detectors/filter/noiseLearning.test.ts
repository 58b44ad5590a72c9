import { describe, expect, it } from 'vitest';
import type { CountedArrival } from '../../../detectors/filter/countedArrival.ts';
import { learnNoise } from '../../../detectors/filter/noiseLearning.ts';
import { learningProblem, logLikelihood } from '../../../detectors/filter/noiseLikelihood.ts';
import { noisePrior } from '../../../detectors/filter/noisePrior.ts';
import type { Walks } from '../../../detectors/filter/stateSpace.ts';
import type { NoiseModel } from '../../../detectors/report.ts';
import { denseFit } from '../../support/denseLeastSquares.ts';
import { dice, observingDays, simulateArrivals, simulateWalk } from '../../support/simulatedPulsar.ts';

const prior = noisePrior(10, -1e-13);
const SIGMA_TURNS = 1e-3;
const still: Walks = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0 };

function arrivalsOf(seed: number, count: number, walks: Walks, cadenceDays = 3): CountedArrival[] {
  const random = dice(seed);
  return simulateArrivals(observingDays(count, cadenceDays, 0.5, random), walks, SIGMA_TURNS, random);
}

/** The scatter that the model gives an arrival of the simulation, in units of the truth. */
function whiteFactor({ uncertaintyScale, floorTurns }: NoiseModel): number {
  return Math.hypot(uncertaintyScale, floorTurns / SIGMA_TURNS);
}

function geometricMean(values: readonly number[]): number {
  return Math.exp(values.reduce((sum, value) => sum + Math.log(value), 0) / values.length);
}

/** RMS phase that the walks add over a gap: what matters to a detector. */
function walkRms({ phaseWalk, frequencyWalk, torqueWalk }: Walks, t: number): number {
  return Math.sqrt(phaseWalk * t + (frequencyWalk * t ** 3) / 3 + (torqueWalk * t ** 5) / 20);
}

describe('likelihood of the innovations', () => {
  it('differs between noise models as that of dense generalised least squares', () => {
    const arrivals = arrivalsOf(61, 60, { ...still, frequencyWalk: 1e-9 });
    const days = arrivals.map(({ tDays }) => tDays);
    const y = Float64Array.from(arrivals, ({ deviationTurns }) => deviationTurns);
    const columns = [0, 1, 2].map((power) => Float64Array.from(days, (t) => (t / 100) ** power));
    const problem = learningProblem(arrivals, []);
    const dense = (noise: NoiseModel): number => {
      const variance = (noise.uncertaintyScale * SIGMA_TURNS) ** 2 + noise.floorTurns ** 2;
      return denseFit(
        days,
        days.map(() => variance),
        noise,
        columns,
        y,
      ).logLikelihood;
    };
    const a: NoiseModel = {
      phaseWalk: 1e-8,
      frequencyWalk: 1e-9,
      torqueWalk: 1e-15,
      uncertaintyScale: 1,
      floorTurns: 3e-4,
    };
    const b: NoiseModel = { ...a, frequencyWalk: 4e-9, uncertaintyScale: 1.2 };
    const difference = logLikelihood(problem, a) - logLikelihood(problem, b);
    // The outlier term gives every well-behaved arrival a little less than its Gaussian weight.
    expect(Math.abs(difference - (dense(a) - dense(b)))).toBeLessThan(0.05);
  });

  it('lets one wild arrival cost a few nats, not hundreds', () => {
    const arrivals = arrivalsOf(62, 100, still);
    const wild = arrivals.map((arrival, i) =>
      i === 50 ? { ...arrival, deviationTurns: arrival.deviationTurns + 0.3 } : arrival,
    );
    const noise = { ...still, uncertaintyScale: 1, floorTurns: 0 };
    const cost = logLikelihood(learningProblem(arrivals, []), noise) - logLikelihood(learningProblem(wild, []), noise);
    expect(cost).toBeGreaterThan(3);
    expect(cost).toBeLessThan(20);
  });

  it('is finite at the edges: no noise at all, arrivals at one time', () => {
    const arrivals = arrivalsOf(63, 20, still).map((arrival) => ({ ...arrival, tDays: Math.floor(arrival.tDays / 9) }));
    const noise = { ...still, uncertaintyScale: 0.5, floorTurns: 0 };
    expect(Number.isFinite(logLikelihood(learningProblem(arrivals, []), noise))).toBe(true);
  });
});

describe('noise learned from simulated pulsars', () => {
  const seeds = [1, 2, 3, 4, 5, 6];

  it('white: the scatter within 10 %, and no walk that could be noticed', () => {
    for (const seed of seeds) {
      const learned = learnNoise(arrivalsOf(seed, 300, still), [], prior);
      expect(Math.abs(whiteFactor(learned) - 1)).toBeLessThan(0.1);
      expect(walkRms(learned, 30)).toBeLessThan(SIGMA_TURNS);
    }
  });

  it.each([
    ['frequency', { ...still, frequencyWalk: 1e-9 }],
    ['torque', { ...still, torqueWalk: 1e-13 }],
    ['phase', { ...still, phaseWalk: 1e-6 }],
  ])('a walk in %s: its effect over 3, 10 and 30 days within a factor 2, 1.25 on average', (_, walks) => {
    const ratios: number[][] = [[], [], []];
    for (const seed of seeds) {
      const learned = learnNoise(arrivalsOf(seed, 300, walks), [], prior);
      [3, 10, 30].forEach((gap, k) => {
        // Against what an arrival shows: walk and its own uncertainty together.
        const told = Math.hypot(walkRms(learned, gap), SIGMA_TURNS * whiteFactor(learned));
        const truth = Math.hypot(walkRms(walks, gap), SIGMA_TURNS);
        ratios[k]!.push(told / truth);
      });
    }
    for (const list of ratios) {
      for (const ratio of list) expect(Math.abs(Math.log(ratio))).toBeLessThan(Math.log(2));
      expect(Math.abs(Math.log(geometricMean(list)))).toBeLessThan(Math.log(1.25));
    }
  });

  it.each([
    ['frequency', { ...still, frequencyWalk: 1e-9 }, 'frequencyWalk'],
    ['torque', { ...still, torqueWalk: 1e-13 }, 'torqueWalk'],
  ] as const)('the strength of a walk in %s within a factor 3, from 1000 arrivals', (_, walks, name) => {
    const learned = learnNoise(arrivalsOf(7, 1000, walks), [], prior);
    expect(Math.abs(Math.log(learned[name] / walks[name]))).toBeLessThan(Math.log(3));
  });

  it('with 8 to 15 arrivals stays near the prior and sane', () => {
    for (const count of [8, 11, 15]) {
      for (const seed of seeds) {
        const learned = learnNoise(arrivalsOf(seed, count, still, 20), [], prior);
        expect(learned.uncertaintyScale).toBeGreaterThanOrEqual(0.5);
        expect(learned.uncertaintyScale).toBeLessThan(3);
        expect(learned.floorTurns).toBeGreaterThanOrEqual(0);
        expect(learned.floorTurns).toBeLessThan(3 * SIGMA_TURNS);
        for (const walk of ['phaseWalk', 'frequencyWalk', 'torqueWalk'] as const) {
          expect(Math.abs(Math.log(learned[walk] / prior[walk].median))).toBeLessThan(2 * prior[walk].lnScatter);
        }
      }
    }
  });

  it('with nothing to learn from is the prior', () => {
    const learned = learnNoise([], [], prior);
    expect(learned.frequencyWalk).toBeCloseTo(prior.frequencyWalk.median, 20);
    const unused = arrivalsOf(1, 5, still).map((arrival) => ({ ...arrival, used: false }));
    expect(learnNoise(unused, [], prior)).toEqual(learned);
  });

  it('is not deceived by 3 % of wild arrivals', () => {
    const { uniform } = dice(70);
    const wild = arrivalsOf(8, 300, still).map((arrival) =>
      uniform() < 0.03 ? { ...arrival, deviationTurns: arrival.deviationTurns + uniform() - 0.5 } : arrival,
    );
    const learned = learnNoise(wild, [], prior);
    expect(whiteFactor(learned)).toBeLessThan(1.25);
    expect(walkRms(learned, 30)).toBeLessThan(2 * SIGMA_TURNS);
  });

  it('learns a glitch as noise unless it is named', () => {
    const glitch = arrivalsOf(9, 200, still).map((arrival, i) =>
      i < 120 ? arrival : { ...arrival, deviationTurns: arrival.deviationTurns - 0.01 * (i - 119) },
    );
    const named = learnNoise(glitch, [{ beforeIndex: 120, kind: 'spin' }], prior);
    const unnamed = learnNoise(glitch, [], prior);
    expect(walkRms(named, 10)).toBeLessThan(SIGMA_TURNS);
    expect(walkRms(unnamed, 10)).toBeGreaterThan(2 * walkRms(named, 10));
  });

  it('carries receiver offsets and dispersion, and steps in them', () => {
    const groups = arrivalsOf(10, 300, still).map((arrival, i) => {
      const group = i % 3;
      const frequencyMhz = i % 2 === 0 ? 500 : 1400;
      const clock = group === 1 && i >= 150 ? 0.02 : 0;
      const dispersion = i >= 200 && frequencyMhz === 500 ? 0.03 : 0;
      return {
        ...arrival,
        group,
        frequencyMhz,
        deviationTurns: arrival.deviationTurns + 0.05 * group + clock + dispersion,
      };
    });
    const learned = learnNoise(
      groups,
      [
        { beforeIndex: 150, kind: 'offset', group: 1 },
        { beforeIndex: 200, kind: 'dispersion' },
      ],
      prior,
    );
    expect(Math.abs(whiteFactor(learned) - 1)).toBeLessThan(0.12);
    expect(walkRms(learned, 10)).toBeLessThan(SIGMA_TURNS);
  });

  it('depends on nothing but its arguments', () => {
    const arrivals = arrivalsOf(11, 100, { ...still, frequencyWalk: 1e-9 });
    expect(learnNoise(arrivals, [], prior)).toEqual(learnNoise(arrivals, [], prior));
  });

  it('finds the same from another start', () => {
    const arrivals = arrivalsOf(12, 200, { ...still, frequencyWalk: 1e-9 });
    const cold = learnNoise(arrivals, [], prior);
    const warm = learnNoise(arrivals, [], prior, cold);
    expect(Math.abs(Math.log(walkRms(warm, 10) / walkRms(cold, 10)))).toBeLessThan(0.1);
  });
});

describe('population prior', () => {
  it('gives the published scatter after a quadratic fit: σ = e^1.6 ν^−1.4 |ν̇/1e-15|^1.1 T² µs', () => {
    // Shannon & Cordes 2010, ApJ 725, 1607 (values from memory): ν = 2 Hz, ν̇ = −1e-14 Hz/s, T = 3 yr: 213 µs.
    const expectedUs = Math.exp(1.6) * 2 ** -1.4 * 10 ** 1.1 * 9;
    const walks = noisePrior(2, -1e-14);
    const medians = {
      phaseWalk: walks.phaseWalk.median,
      frequencyWalk: walks.frequencyWalk.median,
      torqueWalk: walks.torqueWalk.median,
    };
    const days = Array.from({ length: 110 }, (_, i) => 10 * i);
    const random = dice(80);
    let squares = 0;
    const pulsars = 400;
    for (let k = 0; k < pulsars; k++) {
      const y = Float64Array.from(simulateWalk(days, medians, random));
      const columns = [0, 1, 2].map((power) => Float64Array.from(days, (t) => (t / 1000) ** power));
      const fit = denseFit(
        days,
        days.map(() => 1),
        still,
        columns,
        y,
      );
      squares += fit.residualSumOfSquares / days.length / pulsars;
    }
    const rmsUs = (Math.sqrt(squares) / 2) * 1e6;
    console.log(
      `RMS of the prior's walks after a quadratic fit: ${rmsUs.toFixed(0)} µs; published ${expectedUs.toFixed(0)} µs`,
    );
    expect(Math.abs(Math.log(rmsUs / expectedUs))).toBeLessThan(Math.log(1.3));
  });
});
