import { minimise } from '../math/quasiNewton.ts';
import type { NoiseModel } from '../report.ts';
import type { CountedArrival, Disturbance } from './countedArrival.ts';
import { learningProblem, logLikelihood } from './noiseLikelihood.ts';
import type { LogNormal, NoisePrior } from './noisePrior.ts';

const LEAST_SCALE = 0.5;
const LARGEST_SCALE = 10;

/** Strengths of one walk, in scatters of the prior: a pulsar may be far noisier than the population law expects. */
const STRENGTHS = [0.5, 1, 1.5, 2, 2.5, 3, 3.5, 4, 5];
const WALKS = [0, 1, 2];

/**
 * In scatters of the prior (phase, frequency, torque, scale, floor): where to look first. The likelihood has a peak for
 * each kind of walk, and a descent that begins at the wrong one stays there, so that noise is learned far too quiet.
 */
const FIRST_LOOKS = [
  ...[-1, 0, 1].flatMap((frequency) => [-1, 0, 1].map((torque) => [0, frequency, torque, 0, 0])),
  ...WALKS.flatMap((walk) => STRENGTHS.map((z) => [...WALKS.map((other) => (other === walk ? z : -1)), 0, 0])),
];
/** The best look of each walk is followed down if it is within so many natural-log units of the best of all. */
const WORTH_FOLLOWING = 20;

/**
 * The most probable noise model: innovations likelihood times the population prior, over the logarithms of the three
 * walks, of the uncertainty scale and of the floor. With a dozen arrivals the prior rules; with hundreds the data do.
 * Deterministic. Events that are in the data must be named in `disturbances`, or they are learned as noise.
 * @param start where else to look first, for instance what was learned before.
 */
export function learnNoise(
  arrivals: readonly CountedArrival[],
  disturbances: readonly Disturbance[],
  prior: NoisePrior,
  start?: NoiseModel,
): NoiseModel {
  const problem = learningProblem(arrivals, disturbances);
  const coordinates = priorCoordinates(prior, problem.medianSigmaTurns);
  const cost = (point: Float64Array): number =>
    0.5 * point.reduce((sum, z) => sum + z * z, 0) - logLikelihood(problem, coordinates.noiseAt(point));
  const looks: Float64Array[] = FIRST_LOOKS.map((look) => Float64Array.from(look));
  if (start) looks.push(coordinates.pointOf(start));
  const descents = worthFollowing(cost, looks).map((look) =>
    minimise(cost, look, { differenceStep: 0.02, longestStep: 1.5, tolerance: 0.01, maxSteps: 30 }),
  );
  const { point } = descents.reduce((a, b) => (b.value < a.value ? b : a));
  return coordinates.noiseAt(point);
}

/** ln of the prior's density at a noise model, relative to its peak. */
export function logNoisePrior(noise: NoiseModel, prior: NoisePrior, medianSigmaTurns: number): number {
  return (
    -0.5 *
    priorCoordinates(prior, medianSigmaTurns)
      .pointOf(noise)
      .reduce((sum, z) => sum + z * z, 0)
  );
}

/** The noise model in units of the prior: each coordinate has mean 0 and scatter 1. */
interface PriorCoordinates {
  noiseAt(point: Float64Array): NoiseModel;
  pointOf(noise: NoiseModel): Float64Array;
}

function priorCoordinates(prior: NoisePrior, medianSigmaTurns: number): PriorCoordinates {
  const floor = { ...prior.floorOverSigma, median: prior.floorOverSigma.median * medianSigmaTurns };
  const at = ({ median, lnScatter }: LogNormal, z: number): number => median * Math.exp(lnScatter * z);
  const within = (scale: number): number => Math.min(LARGEST_SCALE, Math.max(LEAST_SCALE, scale));
  // A strength of nothing is taken as six scatters below the median.
  const of = ({ median, lnScatter }: LogNormal, value: number): number =>
    Math.max(-6, Math.log(value / median) / lnScatter);
  return {
    noiseAt: (point) => ({
      phaseWalk: at(prior.phaseWalk, point[0]!),
      frequencyWalk: at(prior.frequencyWalk, point[1]!),
      torqueWalk: at(prior.torqueWalk, point[2]!),
      uncertaintyScale: within(at(prior.uncertaintyScale, point[3]!)),
      floorTurns: at(floor, point[4]!),
    }),
    pointOf: (noise) =>
      Float64Array.of(
        of(prior.phaseWalk, noise.phaseWalk),
        of(prior.frequencyWalk, noise.frequencyWalk),
        of(prior.torqueWalk, noise.torqueWalk),
        of(prior.uncertaintyScale, noise.uncertaintyScale),
        of(floor, noise.floorTurns),
      ),
  };
}

/** The cheapest look of each walk that leads, where it is not far above the cheapest of all. */
function worthFollowing(cost: (point: Float64Array) => number, looks: readonly Float64Array[]): Float64Array[] {
  const priced = looks.map((look) => ({ look, value: cost(look), leading: leadingWalk(look) }));
  const least = Math.min(...priced.map(({ value }) => value));
  return WALKS.flatMap((walk) => {
    const own = priced.filter(({ leading, value }) => leading === walk && value <= least + WORTH_FOLLOWING);
    return own.length === 0 ? [] : [own.reduce((a, b) => (b.value < a.value ? b : a)).look];
  });
}

function leadingWalk(point: Float64Array): number {
  return WALKS.reduce((lead, walk) => (point[walk]! > point[lead]! ? walk : lead));
}
