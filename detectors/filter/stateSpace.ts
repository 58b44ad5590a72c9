import type { NoiseModel } from '../report.ts';

/**
 * The rotation as a linear state (phase deviation, its rate, its second rate) in turns and days, driven by random walks
 * in phase, frequency and torque. The deviation counts late as positive, so its rate is minus the departure in ν.
 * Exact discretisation over any gap; closed forms as in Van Loan 1978 (IEEE Trans. AC 23, 395) for an integrator chain.
 */
export const SPIN_STATES = 3;

/** The part of the noise model that moves the state. */
export type Walks = Pick<NoiseModel, 'phaseWalk' | 'frequencyWalk' | 'torqueWalk'>;

/** Writes F(Δt), 3×3 row-major. */
export function writeTransition(deltaDays: number, out: Float64Array): void {
  out[0] = 1;
  out[1] = deltaDays;
  out[2] = 0.5 * deltaDays * deltaDays;
  out[3] = 0;
  out[4] = 1;
  out[5] = deltaDays;
  out[6] = 0;
  out[7] = 0;
  out[8] = 1;
}

/** Writes Q(Δt), 3×3 row-major, symmetric: the covariance that the walks add over the gap. */
export function writeProcessNoise(deltaDays: number, walks: Walks, out: Float64Array): void {
  const t = deltaDays;
  const t2 = t * t;
  const t3 = t2 * t;
  const { phaseWalk, frequencyWalk, torqueWalk } = walks;
  out[0] = phaseWalk * t + (frequencyWalk * t3) / 3 + (torqueWalk * t2 * t3) / 20;
  out[1] = (frequencyWalk * t2) / 2 + (torqueWalk * t2 * t2) / 8;
  out[2] = (torqueWalk * t3) / 6;
  out[3] = out[1];
  out[4] = frequencyWalk * t + (torqueWalk * t3) / 3;
  out[5] = (torqueWalk * t2) / 2;
  out[6] = out[2];
  out[7] = out[5];
  out[8] = torqueWalk * t;
}

/** Variance of one arrival in turns²: (scale·σ)² + floor². */
export function arrivalVariance(sigmaTurns: number, noise: NoiseModel): number {
  const scaled = noise.uncertaintyScale * sigmaTurns;
  return scaled * scaled + noise.floorTurns * noise.floorTurns;
}
