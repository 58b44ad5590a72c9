/** A log-normal prior: median, and scatter in natural-log units. */
export interface LogNormal {
  readonly median: number;
  readonly lnScatter: number;
}

/** What the population says about one pulsar's noise before its own arrivals speak. Units as in `NoiseModel`. */
export interface NoisePrior {
  readonly phaseWalk: LogNormal;
  readonly frequencyWalk: LogNormal;
  readonly torqueWalk: LogNormal;
  readonly uncertaintyScale: LogNormal;
  /** Median as a fraction of the median stated uncertainty. */
  readonly floorOverSigma: LogNormal;
}

const DAYS_PER_YEAR = 365.25;

const SECONDS_PER_DAY = 86_400;

/**
 * A pulsar that spins up is spun up by what falls onto it, and that torque comes and goes by about as much as itself from
 * day to day: white torque noise, a random walk in frequency (Bildsten et al. 1997, ApJS 113, 367; the time from memory).
 */
const ACCRETION_DAYS = 1;

/** Span at which the population law is turned into walk strengths. */
const REFERENCE_SPAN_YEARS = 3;

/**
 * RMS of a walk at the end of a span over the RMS left after a quadratic fit: 4.8, 29.2 and 53.0 for walks in phase,
 * frequency and torque (own simulation; Cordes 1980, ApJ 237, 216 gives the span-averaged ratios 3.7, 15.5, 23.7).
 */
const END_OVER_RESIDUAL = { phase: 4.8, frequency: 29.2, torque: 53.0 } as const;

/**
 * Population scaling of timing noise: ln σ[µs] = 1.6 − 1.4 ln ν + 1.1 ln|ν̇/1e-15| + 2 ln T[yr], scatter 1.6 in ln
 * (Shannon & Cordes 2010, ApJ 725, 1607, σ after a quadratic fit). The residual variance is shared equally between the
 * walks in frequency and torque, whose spans' growth T^1.5 and T^2.5 bracket the law's T²; one per cent goes to phase.
 * The scatter is widened by 1.25 for that split and for the scatter of ×30 at given ν̇ (Namkham et al. 2019).
 * A pulsar that spins up walks in frequency at least as its accretion makes it.
 * @param frequencyDerivativeHzPerS a size below 1e-18 is taken as 1e-18 (a model without spin-down).
 */
export function noisePrior(frequencyHz: number, frequencyDerivativeHzPerS: number): NoisePrior {
  const spinDown = Math.max(Math.abs(frequencyDerivativeHzPerS), 1e-18) / 1e-15;
  const lnSigmaUs = 1.6 - 1.4 * Math.log(frequencyHz) + 1.1 * Math.log(spinDown) + 2 * Math.log(REFERENCE_SPAN_YEARS);
  const residualTurns = Math.exp(lnSigmaUs) * 1e-6 * frequencyHz;
  const variance = residualTurns * residualTurns;
  const spanDays = REFERENCE_SPAN_YEARS * DAYS_PER_YEAR;
  const lnScatter = 1.25 * 2 * 1.6;
  const frequencyWalk = (0.5 * 3 * END_OVER_RESIDUAL.frequency ** 2 * variance) / spanDays ** 3;
  const spinUpPerDay = Math.max(0, frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2;
  return {
    phaseWalk: { median: (0.01 * END_OVER_RESIDUAL.phase ** 2 * variance) / spanDays, lnScatter },
    frequencyWalk: { median: Math.max(frequencyWalk, spinUpPerDay ** 2 * ACCRETION_DAYS), lnScatter },
    torqueWalk: { median: (0.5 * 20 * END_OVER_RESIDUAL.torque ** 2 * variance) / spanDays ** 5, lnScatter },
    uncertaintyScale: { median: 1.1, lnScatter: 0.5 },
    floorOverSigma: { median: 0.3, lnScatter: 1.5 },
  };
}
