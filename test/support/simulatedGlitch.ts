import type { CountedArrival } from '../../detectors/filter/countedArrival.ts';

const SECONDS_PER_DAY = 86_400;

/** A glitch to put into simulated arrivals. */
export interface InjectedGlitch {
  readonly epochDays: number;
  readonly persistentNuHz: number;
  readonly persistentNuDotHzPerS: number;
  readonly decayingNuHz: number;
  readonly timescaleDays: number;
}

/**
 * Turns that the glitch adds to the rotation, term by term as published (Yu et al. 2013, MNRAS 429, 688; Lower et al.
 * 2021, MNRAS 508, 3251): Δν_p Δt + ½ Δν̇_p Δt² + Δν_d τ (1 − e^(−Δt/τ)).
 */
export function glitchTurns(glitch: InjectedGlitch, tDays: number): number {
  const since = (tDays - glitch.epochDays) * SECONDS_PER_DAY;
  if (since <= 0) return 0;
  const timescale = glitch.timescaleDays * SECONDS_PER_DAY;
  return (
    glitch.persistentNuHz * since +
    0.5 * glitch.persistentNuDotHzPerS * since ** 2 +
    glitch.decayingNuHz * timescale * (1 - Math.exp(-since / timescale))
  );
}

/** More turns make pulses early. */
export function withGlitch(arrivals: readonly CountedArrival[], glitch: InjectedGlitch): CountedArrival[] {
  return arrivals.map((arrival) => ({
    ...arrival,
    deviationTurns: arrival.deviationTurns - glitchTurns(glitch, arrival.tDays),
  }));
}
