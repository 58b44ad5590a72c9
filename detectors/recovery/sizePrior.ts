const SECONDS_PER_DAY = 86_400;

/**
 * Weak priors on the sizes of a glitch, zero-mean Gaussians, which keep its evidence proper. Sizes span six decades
 * (Yu et al. 2013, MNRAS 429, 688: 1e-10 to 1e-5 of ν), so one width would favour one size: a ladder of widths, each
 * rung as likely as the next, is close to flat in the logarithm of the size.
 */
export interface SizePrior {
  /** Widths (1σ) for Δν_p, Hz. */
  readonly frequencyStepsHz: readonly number[];
  /** Widths (1σ) for Δν̇_p, Hz/s. */
  readonly derivativeStepsHzPerS: readonly number[];
  /** Widths (1σ) for each Δνⱼ that decays or arrives late, as parts of the width for Δν_p. */
  readonly decayingParts: readonly number[];
}

/** One rung, in turns and days; all rungs together have probability 1. */
export interface SizeScale {
  readonly rate: number;
  readonly second: number;
  readonly decay: number;
  readonly logShare: number;
}

/**
 * Δν/ν from 1e-10 to 3e-5; Δν̇/ν̇ of 1 per cent, where most are published, or of any size up to about its own; recovery
 * fractions of a few per cent, as after most large glitches, or of any size (Yu et al. 2013, table 4: 0.001 to 0.8).
 */
export function defaultSizePrior(frequencyHz: number, frequencyDerivativeHzPerS: number): SizePrior {
  const spinDown = Math.max(Math.abs(frequencyDerivativeHzPerS), 1e-18);
  return {
    frequencyStepsHz: [2e-10, 2e-9, 2e-8, 2e-7, 2e-6, 1.5e-5].map((part) => part * frequencyHz),
    derivativeStepsHzPerS: [0.01, 0.06, 0.3].map((part) => part * spinDown),
    decayingParts: [0.05, 0.7],
  };
}

/** The rungs of a glitch without recovery (`terms` = 0), or with. */
export function sizeScales(prior: SizePrior, terms: number): SizeScale[] {
  const parts = terms === 0 ? [0] : prior.decayingParts;
  const rungs = prior.frequencyStepsHz.flatMap((step) =>
    prior.derivativeStepsHzPerS.flatMap((derivative) =>
      parts.map((part) => ({
        rate: step * SECONDS_PER_DAY,
        second: derivative * SECONDS_PER_DAY * SECONDS_PER_DAY,
        decay: part * step * SECONDS_PER_DAY,
      })),
    ),
  );
  return rungs.map((rung) => ({ ...rung, logShare: -Math.log(rungs.length) }));
}

export function widestOf(scales: readonly SizeScale[]): SizeScale {
  const widest = (of: (scale: SizeScale) => number) => Math.max(...scales.map(of));
  return {
    rate: widest(({ rate }) => rate),
    second: widest(({ second }) => second),
    decay: widest(({ decay }) => decay),
    logShare: 0,
  };
}
