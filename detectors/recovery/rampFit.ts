/** A slow spin-up: ν rises evenly over weeks, by an amount, from a day and for a time that the fit finds. */

import { logSumExp } from '../math/logSumExp.ts';
import type { EventData } from './eventFrame.ts';
import { type Estimate, gridEstimate } from './mixture.ts';
import { fitStep, type StepFit } from './stepFit.ts';

/** Days, evenly in the logarithm: shorter is a glitch, longer a change of the spin-down rate. */
export const RAMP_DURATIONS_DAYS = [10, 14, 20, 28, 40, 56, 80, 110];

export interface RampFit {
  /** Natural log, on the scale of the other fits to the same arrivals, noise and gaps. */
  readonly logEvidence: number;
  /** Of the most probable duration; its size is the whole Δν, Hz. */
  readonly step: StepFit;
  readonly durationDays: Estimate;
  /** What the ramp adds to ν, Hz. */
  readonly frequencyCurve: (tDays: number) => number;
}

export function fitRamp(input: EventData & { frequencyHz: number; frequencyDerivativeHzPerS: number }): RampFit {
  const fits = RAMP_DURATIONS_DAYS.map((durationDays) => fitStep({ ...input, kind: 'ramp', durationDays }));
  const masses = fits.map((fit) => fit.logEvidenceStep);
  const highest = Math.max(...masses);
  const best = masses.indexOf(highest);
  const step = fits[best]!;
  const duration = RAMP_DURATIONS_DAYS[best]!;
  const size = step.size.mean;
  return {
    logEvidence: logSumExp(masses) - Math.log(masses.length),
    step,
    durationDays: gridEstimate(
      Float64Array.from(RAMP_DURATIONS_DAYS),
      Float64Array.from(masses, (mass) => Math.exp(mass - highest)),
    ),
    frequencyCurve: (t) => size * Math.min(1, Math.max(0, (t - step.bestEpochDays) / duration)),
  };
}
