/**
 * A programme gone through under one noise model, with the signatures of steps and with drawn noise in place of data:
 * all go through the same whitening filter (de Jong 1991). What comes out are the sums that every later weighing needs.
 */

import { nuisanceLayout, writeSensitivity } from '../filter/nuisance.ts';
import { arrivalVariance, writeProcessNoise } from '../filter/stateSpace.ts';
import { absorbArrival, createWhiteningFilter, expectArrival, predict } from '../filter/whiteningFilter.ts';
import { choleskyFactor } from '../math/cholesky.ts';
import type { NoiseModel } from '../report.ts';
import { normalStream } from './draws.ts';
import type { Programme } from './programme.ts';

/** A step has three signatures: of the phase, of its rate, and of its second derivative. */
export const SIGNATURES = 3;

export interface Stage {
  readonly programme: Programme;
  /** First arrival after each gap in which a step is looked for; the first of them is where it truly is. `offsets`: from there. */
  readonly gaps: readonly number[];
  readonly offsets: readonly number[];
  /** Weighed after these arrivals. */
  readonly looks: readonly number[];
  readonly draws: number;
  /** arrivals × draws: what noise alone would show. */
  readonly noiseOnly: readonly Float64Array[];
  readonly priorSd: readonly number[];
}

/** What stands at one look. Matrices are 3×3, row-major. */
export interface Sums {
  /** Arrivals so far, and Σ ln S. */
  readonly arrivals: number;
  readonly logVariance: number;
  /** By draw: Σ e²/S. */
  readonly squares: readonly number[];
  /** By gap: information of its own signatures, and of them with those of the true step. */
  readonly own: readonly (readonly number[])[];
  readonly cross: readonly (readonly number[])[];
  /** By gap and signature: Σ s e/S of each draw. */
  readonly projections: readonly (readonly number[])[];
}

/** One pair of draws for each noise model, of opposite sign, so that no odd moment is off. */
export function drawNoise(programme: Programme, noises: readonly NoiseModel[]): Float64Array[] {
  const { arrivals } = programme;
  const normal = normalStream(1);
  const half = noises.length;
  const states = noises.map(() => [0, 0, 0]);
  const walk = new Float64Array(9);
  return arrivals.map((arrival, i) => {
    const t = i === 0 ? 0 : arrival.tDays - arrivals[i - 1]!.tDays;
    const values = new Float64Array(2 * half);
    states.forEach((state, m) => {
      const noise = noises[m]!;
      writeProcessNoise(t, noise, walk);
      choleskyFactor(walk, SIGNATURES);
      const sigma = Math.sqrt(arrivalVariance(arrival.sigmaTurns, noise));
      state[0]! += t * state[1]! + 0.5 * t * t * state[2]!;
      state[1]! += t * state[2]!;
      if (t > 0) {
        const [x, y, z] = [normal(), normal(), normal()];
        state[0]! += walk[0]! * x;
        state[1]! += walk[3]! * x + walk[4]! * y;
        state[2]! += walk[6]! * x + walk[7]! * y + walk[8]! * z;
      }
      values[m] = state[0]! + sigma * normal();
      values[half + m] = -values[m]!;
    });
    return values;
  });
}

export function rehearse(stage: Stage, noise: NoiseModel): Sums[] {
  const { programme, gaps, looks, draws, noiseOnly } = stage;
  const { arrivals, firstAhead, pastWeight } = programme;
  const layout = nuisanceLayout(arrivals);
  const signals = SIGNATURES * gaps.length;
  const filter = createWhiteningFilter(stage.priorSd, signals + draws);
  const row = new Float64Array(layout.size);
  const values = new Float64Array(signals + draws);
  const running = emptySums(gaps.length, draws);
  const found: Sums[] = [];
  let logVariance = 0;
  for (let i = 0; i < arrivals.length; i++) {
    const arrival = arrivals[i]!;
    predict(filter, i === 0 ? 0 : arrival.tDays - arrivals[i - 1]!.tDays, noise);
    writeSensitivity(layout, arrival, row);
    expectArrival(filter, row);
    gaps.forEach((gap, g) => {
      if (i < gap) return;
      const since = arrival.tDays - arrivals[gap]!.tDays;
      values[SIGNATURES * g] = 1;
      values[SIGNATURES * g + 1] = since;
      values[SIGNATURES * g + 2] = 0.5 * since * since;
    });
    values.set(noiseOnly[i]!, signals);
    absorbArrival(filter, values, arrivalVariance(arrival.sigmaTurns, noise));
    const weight = i < firstAhead ? pastWeight : 1;
    logVariance += weight * Math.log(filter.innovationVariance);
    gather(running, gaps, i, filter.innovations, filter.innovationVariance, weight);
    if (looks.includes(i)) found.push({ ...copyOf(running), arrivals: i + 1, logVariance });
  }
  return found;
}

/** Plain arrays: they are copied by the thousand, and short plain ones copy several times faster. */
interface Running {
  readonly squares: number[];
  readonly own: number[][];
  readonly cross: number[][];
  readonly projections: number[][];
}

function emptySums(gaps: number, draws: number): Running {
  const many = (count: number, size: number) => Array.from({ length: count }, () => new Array<number>(size).fill(0));
  return {
    squares: new Array<number>(draws).fill(0),
    own: many(gaps, SIGNATURES ** 2),
    cross: many(gaps, SIGNATURES ** 2),
    projections: many(SIGNATURES * gaps, draws),
  };
}

function copyOf({ squares, own, cross, projections }: Running): Running {
  const copies = (all: readonly number[][]) => all.map((one) => one.slice());
  return { squares: squares.slice(), own: copies(own), cross: copies(cross), projections: copies(projections) };
}

function gather(
  sums: Running,
  gaps: readonly number[],
  i: number,
  innovations: Float64Array,
  variance: number,
  weight: number,
): void {
  const { squares, own, cross, projections } = sums;
  const per = SIGNATURES;
  const first = per * gaps.length;
  const draws = squares.length;
  for (let m = 0; m < draws; m++) {
    const innovation = innovations[first + m]!;
    squares[m]! += (weight * innovation * innovation) / variance;
  }
  for (let g = 0; g < gaps.length; g++) {
    if (i < gaps[g]!) continue;
    const ownSums = own[g]!;
    const crossSums = cross[g]!;
    for (let a = 0; a < per; a++) {
      const s = innovations[per * g + a]! / variance;
      const projection = projections[per * g + a]!;
      for (let m = 0; m < draws; m++) projection[m]! += s * innovations[first + m]!;
      for (let b = 0; b < per; b++) {
        ownSums[per * a + b]! += s * innovations[per * g + b]!;
        crossSums[per * a + b]! += s * innovations[b]!;
      }
    }
  }
}
