import { nelderMead } from '../math/nelderMead.ts';
import type { NoiseModel } from '../report.ts';
import type { CountedArrival, Disturbance } from './countedArrival.ts';
import { learningProblem, logLikelihood } from './noiseLikelihood.ts';
import type { LogNormal, NoisePrior } from './noisePrior.ts';

const LEAST_SCALE = 0.5;
const LARGEST_SCALE = 10;

/**
 * The most probable noise model: innovations likelihood times the population prior, over the logarithms of the three
 * walks, of the uncertainty scale and of the floor. With a dozen arrivals the prior rules; with hundreds the data do.
 * Deterministic. Events that are in the data must be named in `disturbances`, or they are learned as noise.
 * @param start where to begin, for instance what was learned before; it saves no evidence, only time.
 */
export function learnNoise(
  arrivals: readonly CountedArrival[],
  disturbances: readonly Disturbance[],
  prior: NoisePrior,
  start?: NoiseModel,
): NoiseModel {
  const problem = learningProblem(arrivals, disturbances);
  const centre = Float64Array.of(
    Math.log(prior.phaseWalk.median),
    Math.log(prior.frequencyWalk.median),
    Math.log(prior.torqueWalk.median),
    Math.log(prior.uncertaintyScale.median),
    Math.log(prior.floorOverSigma.median * problem.medianSigmaTurns),
  );
  const scatter = [
    prior.phaseWalk,
    prior.frequencyWalk,
    prior.torqueWalk,
    prior.uncertaintyScale,
    prior.floorOverSigma,
  ].map((p: LogNormal) => p.lnScatter);
  if (problem.count === 0) return noiseAt(centre);
  const cost = (point: Float64Array): number =>
    penalty(point, centre, scatter) - logLikelihood(problem, noiseAt(point));
  const begin = bestStart(cost, startPoints(centre, scatter, start));
  const { point } = nelderMead(cost, begin, {
    steps: [1.5, 1.5, 1.5, 0.3, 0.7],
    tolerance: 0.02,
    maxEvaluations: 260,
  });
  return noiseAt(point);
}

function noiseAt(point: ArrayLike<number>): NoiseModel {
  return {
    phaseWalk: Math.exp(point[0]!),
    frequencyWalk: Math.exp(point[1]!),
    torqueWalk: Math.exp(point[2]!),
    uncertaintyScale: Math.min(LARGEST_SCALE, Math.max(LEAST_SCALE, Math.exp(point[3]!))),
    floorTurns: Math.exp(point[4]!),
  };
}

function penalty(point: Float64Array, centre: Float64Array, scatter: readonly number[]): number {
  let sum = 0;
  for (let i = 0; i < point.length; i++) {
    const z = (point[i]! - centre[i]!) / scatter[i]!;
    sum += 0.5 * z * z;
  }
  return sum;
}

/** In scatters of the prior (phase, frequency, torque): the likelihood can have a peak for each kind of walk. */
const FIRST_LOOKS = [
  ...[-1, 0, 1].flatMap((frequency) => [-1, 0, 1].map((torque) => [0, frequency, torque] as const)),
  [1, -1, -1],
  [2, -1, -1],
] as const;

function startPoints(centre: Float64Array, scatter: readonly number[], start: NoiseModel | undefined): Float64Array[] {
  const points = FIRST_LOOKS.map((look) => centre.map((value, walk) => value + (look[walk] ?? 0) * scatter[walk]!));
  if (start) {
    const { phaseWalk, frequencyWalk, torqueWalk, uncertaintyScale, floorTurns } = start;
    const values = [phaseWalk, frequencyWalk, torqueWalk, uncertaintyScale, floorTurns];
    if (values.every((value) => value > 0)) points.push(Float64Array.from(values, Math.log));
  }
  return points;
}

function bestStart(cost: (point: Float64Array) => number, points: readonly Float64Array[]): Float64Array {
  let best = points[0]!;
  let least = Number.POSITIVE_INFINITY;
  for (const point of points) {
    const value = cost(point);
    if (value < least) {
      least = value;
      best = point;
    }
  }
  return best;
}
