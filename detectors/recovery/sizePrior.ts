const SECONDS_PER_DAY = 86_400;

/**
 * Weak priors on the sizes of a glitch, zero-mean Gaussians, which keep its evidence proper. Sizes span six decades
 * (Yu et al. 2013, MNRAS 429, 688: 1e-10 to 1e-5 of ν), so one width would favour one size: a ladder of widths, each
 * rung as likely as the next, is close to flat in the logarithm of the size.
 */
export interface SizePrior {
  /** Widths (1σ) for Δν_p and Δν₁ alike, Hz. */
  readonly frequencyStepsHz: readonly number[];
  /** Widths (1σ) for Δν̇_p, Hz/s. */
  readonly derivativeStepsHzPerS: readonly number[];
}

/** One rung, in turns and days. */
export interface SizeScale {
  readonly rate: number;
  readonly second: number;
}

/** Δν/ν from 1e-10 to 3e-5; Δν̇/ν̇ of 1 per cent, where most are published, or of any size up to its own. */
export function defaultSizePrior(frequencyHz: number, frequencyDerivativeHzPerS: number): SizePrior {
  const spinDown = Math.max(Math.abs(frequencyDerivativeHzPerS), 1e-18);
  return {
    frequencyStepsHz: [2e-10, 2e-9, 2e-8, 2e-7, 2e-6, 1.5e-5].map((part) => part * frequencyHz),
    derivativeStepsHzPerS: [0.01, 0.3].map((part) => part * spinDown),
  };
}

export function sizeScales(prior: SizePrior): SizeScale[] {
  return prior.frequencyStepsHz.flatMap((step) =>
    prior.derivativeStepsHzPerS.map((derivative) => ({
      rate: step * SECONDS_PER_DAY,
      second: derivative * SECONDS_PER_DAY * SECONDS_PER_DAY,
    })),
  );
}
