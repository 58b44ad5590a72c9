/**
 * When several arrivals in a row fit nothing, the step was large: whole turns wrapped between arrivals. The frequency
 * step is then sought over its physical range by the circular likelihood |Σ exp 2πi(dⱼ + Δν tⱼ)| / n, which does not
 * care about whole turns (a Rayleigh test for a line, Mardia & Jupp 2000, Directional Statistics, §6.3).
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
  /** Deviation at the first point, turns in [-0.5, 0.5). */
  readonly phase: number;
  /** 0…1 */
  readonly concentration: number;
  /** Half width of the peak, turns per day. */
  readonly width: number;
}

const OVERSAMPLING = 8;
const LEAST_CONCENTRATION = 0.75;
const MOST_PEAKS = 25;
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
): SearchPeak[] {
  const span = points.at(-1)!.days - points[0]!.days;
  const trials = Math.min(MOST_TRIALS, Math.ceil((highest - lowest) * OVERSAMPLING * span) + 1);
  const width = (highest - lowest) / Math.max(1, trials - 1);
  const power = new Float64Array(trials);
  const phase = new Float64Array(trials);
  const angle0 = points.map((p) => 2 * Math.PI * (p.deviation + lowest * p.days));
  const stepAngle = points.map((p) => 2 * Math.PI * width * p.days);
  for (let k = 0; k < trials; k++) {
    let c = 0;
    let s = 0;
    for (let j = 0; j < points.length; j++) {
      const angle = angle0[j]! + k * stepAngle[j]!;
      c += Math.cos(angle);
      s += Math.sin(angle);
    }
    power[k] = Math.hypot(c, s) / points.length;
    phase[k] = Math.atan2(s, c) / (2 * Math.PI);
  }
  const peaks: SearchPeak[] = [];
  for (let k = 0; k < trials; k++) {
    const p = power[k]!;
    if (p < LEAST_CONCENTRATION || p < (power[k - 1] ?? 0) || p <= (power[k + 1] ?? 0)) continue;
    peaks.push({ frequencyStep: lowest + k * width, phase: phase[k]!, concentration: p, width });
  }
  const sharpness = points.length / ((2 * Math.PI) ** 2 * (spread * spread + GRID_SPREAD * GRID_SPREAD));
  const score = (p: SearchPeak) =>
    sharpness * (p.concentration - 1) - Math.log(Math.max(Math.abs(p.frequencyStep), p.width));
  return peaks.sort((a, b) => score(b) - score(a)).slice(0, MOST_PEAKS);
}
