import type { PulsarModel, TimedArrival } from '../../detectors/index.ts';
import { type Dice, dice, observingDays } from './simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from './simulatedWatch.ts';

/** What is true of a site: its clock steps in one night, in which its first pulsar may glitch too. */
export interface SiteTruth {
  readonly seed: number;
  /** Late positive; 0: the site is quiet. */
  readonly stepUs: number;
  readonly cadenceDays: number;
}

export interface FoldedPulsar {
  readonly model: PulsarModel;
  readonly log: readonly TimedArrival[];
}

export const SITE_EPOCH_MJD = 60_000;
export const STEP_DAY = 75;
export const SITE_DAYS = 115;
/** The glitch comes so long before the step that no arrival lies between. */
const GLITCH_DAY = STEP_DAY - 0.01;
const MOST_PULSARS = 1000;
/** Neighbouring seeds would begin alike. */
const STRIDE = 7919;
const WARM_UP = 20;

export function warmDice(seed: number): Dice {
  const random = dice(seed * STRIDE);
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  return random;
}

/**
 * One pulsar of the site: 33 ms to 1.4 s, errors of 5 to 50 µs, a walk in frequency.
 * @param glitchSize Δν/ν in the night of the step; 0: none. All else is the same with it and without.
 */
export function pulsarOfSite({ seed, stepUs, cadenceDays }: SiteTruth, index: number, glitchSize = 0): FoldedPulsar {
  const random = warmDice(seed * MOST_PULSARS + index);
  const frequencyHz = logUniform(0.7, 30, random).toFixed(6);
  const nu = Number(frequencyHz);
  const model = modelOf({
    name: `KR ${String(index).padStart(4, '0')}+00`,
    frequencyHz,
    frequencyDerivativeHzPerS: -1e-15,
    epochMjd: SITE_EPOCH_MJD,
  });
  const days = observingDays(Math.floor(SITE_DAYS / cadenceDays), cadenceDays, 0.3, random);
  const walks = { phaseWalk: 1e-14, frequencyWalk: logUniform(1e-15, 1e-13, random), torqueWalk: 1e-22 };
  const uncertaintyUs = logUniform(5, 50, random);
  const glitch = spinUp(nu, GLITCH_DAY, glitchSize);
  const happening: typeof glitch = (t, place) => (t > STEP_DAY ? stepUs * 1e-6 * nu : 0) + glitch(t, place);
  return { model, log: simulateTimedArrivals(model, { days, walks, uncertaintyUs, happening }, random) };
}

export function logUniform(low: number, high: number, { uniform }: Dice): number {
  return low * (high / low) ** uniform();
}
