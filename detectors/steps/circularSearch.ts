/**
 * When several arrivals in a row fit nothing, the step was large: whole turns wrapped between arrivals. The frequency
 * step is then sought over its physical range by the circular likelihood |Σ exp 2πi(dⱼ + Δν tⱼ)| / n, which does not
 * care about whole turns (a Rayleigh test for a line, Mardia & Jupp 2000, Directional Statistics, §6.3). A recovery that
 * goes with the step bends the line; so bends are tried one after the other.
 */

export interface SearchPoint {
  /** Days since the first of the points. */
  readonly days: number;
  /** Wrapped deviation from the prediction before the step, turns, late positive. */
  readonly deviation: number;
}

export interface SearchPeak {
  /** Δν in turns per day; positive is a spin-up. */
  readonly frequencyStep: number;
  /** Second derivative of the deviation after the step, turns per day². */
  readonly curvature: number;
  /** Deviation at the first point, turns in [-0.5, 0.5). */
  readonly phase: number;
  /** 0…1 */
  readonly concentration: number;
  /** Half width of the peak, turns per day. */
  readonly width: number;
}

/** Δν/ν within which steps are sought. */
export const LOWEST_STEP = -1e-5;
export const HIGHEST_STEP = 5e-5;
/** Sizes are log-uniform over 1e-9…1e-4 of ν. */
export const LOG_SIZE_RANGE = Math.log(1e5);

/**
 * Turns by which the deviation may be bent at the last point. A recovery, and a spin-down that has become faster, make
 * later pulses late: positive.
 */
export const STRAIGHT: readonly number[] = [0];
export const BEND_STEP_TURNS = 0.25;
export const BENDS: readonly number[] = Array.from({ length: 35 }, (_, k) => (k - 2) * BEND_STEP_TURNS);
/** Natural log of the prior of a bend, relative to none: exponential, a turn at scale. */
export function logBendPrior(turns: number): number {
  return -Math.abs(turns);
}

const OVERSAMPLING = 8;
const LEAST_CONCENTRATION = 0.75;
const MOST_PEAKS = 40;
/** Bounds the work for millisecond pulsars over long runs. */
const MOST_TRIALS = 400_000;
/** Spread, turns, that the grid's own step leaves at a peak. */
const GRID_SPREAD = 0.02;

/**
 * Peaks of the circular likelihood for steps in [lowest, highest] turns per day, most probable first: by the fit, for a
 * scatter of `spread` turns about the prediction, and by a log-uniform prior on the size. Regular schedules make combs of
 * peaks that fit alike; the prior puts the small steps of a comb first.
 */
export function searchStep(
  points: readonly SearchPoint[],
  lowest: number,
  highest: number,
  spread: number,
  bends: readonly number[],
): SearchPeak[] {
  const span = points.at(-1)!.days - points[0]!.days;
  const trials = Math.min(MOST_TRIALS, Math.ceil((highest - lowest) * OVERSAMPLING * span) + 1);
  const width = (highest - lowest) / Math.max(1, trials - 1);
  const sharpness = points.length / ((2 * Math.PI) ** 2 * (spread * spread + GRID_SPREAD * GRID_SPREAD));
  const scored: { peak: SearchPeak; score: number }[] = [];
  for (const bend of bends)
    for (const peak of peaksOf(points, { lowest, width, trials, curvature: (2 * bend) / (span * span) })) {
      const size = Math.max(Math.abs(peak.frequencyStep), peak.width);
      scored.push({ peak, score: sharpness * (peak.concentration - 1) - Math.log(size) + logBendPrior(bend) });
    }
  return scored
    .sort((a, b) => b.score - a.score)
    .slice(0, MOST_PEAKS)
    .map(({ peak }) => peak);
}

interface Scan {
  readonly lowest: number;
  readonly width: number;
  readonly trials: number;
  readonly curvature: number;
}

/** Local maxima over the frequency step, for one curvature. Each point is a phasor, turned on from trial to trial. */
function peaksOf(points: readonly SearchPoint[], { lowest, width, trials, curvature }: Scan): SearchPeak[] {
  const count = points.length;
  const start = points.map((p) => 2 * Math.PI * (p.deviation + lowest * p.days - 0.5 * curvature * p.days * p.days));
  const real = Float64Array.from(start, Math.cos);
  const imaginary = Float64Array.from(start, Math.sin);
  const turnReal = Float64Array.from(points, (p) => Math.cos(2 * Math.PI * width * p.days));
  const turnImaginary = Float64Array.from(points, (p) => Math.sin(2 * Math.PI * width * p.days));
  const peaks: SearchPeak[] = [];
  let before = 0;
  let here = 0;
  let phase = 0;
  for (let k = 0; k <= trials; k++) {
    let c = 0;
    let s = 0;
    // One trial beyond the last stands for nothing, so that the last can be a peak.
    for (let j = 0; k < trials && j < count; j++) {
      const re = real[j]!;
      const im = imaginary[j]!;
      c += re;
      s += im;
      real[j] = re * turnReal[j]! - im * turnImaginary[j]!;
      imaginary[j] = re * turnImaginary[j]! + im * turnReal[j]!;
    }
    const next = Math.sqrt(c * c + s * s) / count;
    if (here >= LEAST_CONCENTRATION && here >= before && here > next)
      peaks.push({ frequencyStep: lowest + (k - 1) * width, curvature, phase, concentration: here, width });
    before = here;
    here = next;
    phase = here >= LEAST_CONCENTRATION ? Math.atan2(s, c) / (2 * Math.PI) : 0;
  }
  return peaks;
}
