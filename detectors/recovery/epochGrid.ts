import { choleskyFactor, solveLower, solveLowerTransposed } from '../math/cholesky.ts';
import { type GapSystem, type RecoveryColumn, ROWS } from './gapSystem.ts';
import type { SizeScale } from './sizePrior.ts';

/** Where in a gap to evaluate the posterior for one shift of the pulse count after the event. */
export interface EpochGrid {
  /** Whole turns added to every deviation after the event. */
  readonly countShift: number;
  /** ln of the number of shifts that this one stands for. */
  readonly logWeight: number;
  /** Days from the epoch to the end of the gap, ascending. */
  readonly leads: Float64Array;
}

const COARSE = 24;
const FINE = 20;
/** Beyond so many admissible shifts, every second, third … stands for its neighbours. */
const MOST_SHIFTS = 9;
/** Largest exponent in the backward extrapolation of a recovery. */
const STEEPEST = 30;

/**
 * Phase is continuous at the epoch: where the curve fitted to the arrivals after the gap, run backward, meets a whole
 * turn of the curve before it, the posterior has a peak of width σ(phase)/|Δν|. Returns grids that resolve every peak.
 * Candidate epochs are 1/Δν apart; the counts as given are shift 0.
 */
export function epochGrids(system: GapSystem, recovery: RecoveryColumn, widest: SizeScale): EpochGrid[] {
  const { lengthDays } = system.gap;
  const coarse = coarseLeads(lengthDays);
  const curve = backwardCurve(system, recovery, widest);
  const heights = Float64Array.from(coarse, (lead) => curve.height(lead));
  const shifts = admissibleShifts(heights, curve.sd(0), curve.rateSd * lengthDays);
  const stride = Math.ceil(shifts.length / MOST_SHIFTS);
  const kept = shifts.filter((shift) => shift % stride === 0);
  return kept.map((countShift) => {
    const peaks = crossings(coarse, heights, -countShift, curve.height);
    const leads: number[] = [];
    let narrow = peaks.length > 0;
    for (const peak of peaks) {
      const width = curve.sd(peak) / Math.max(Math.abs(curve.slope(peak)), 1e-300);
      if (width > lengthDays / 8) narrow = false;
      for (let i = 0; i <= FINE; i++) {
        const lead = peak + ((10 * i) / FINE - 5) * width;
        if (lead > 0 && lead < lengthDays) leads.push(lead);
      }
    }
    if (!narrow || countShift === 0) leads.push(...coarse);
    return { countShift, logWeight: Math.log(stride), leads: Float64Array.from(new Set(leads)).sort() };
  });
}

/** Even steps, and finer ones towards both ends, where a peak may be cut off. */
function coarseLeads(lengthDays: number): Float64Array {
  const leads = new Set<number>();
  for (let i = 0; i <= COARSE; i++) leads.add((i / COARSE) * lengthDays);
  for (const part of [0.02, 0.01, 0.003, 0.001, 0.0003, 0.0001]) {
    leads.add(part * lengthDays);
    leads.add((1 - part) * lengthDays);
  }
  return Float64Array.from(leads).sort();
}

interface BackwardCurve {
  /** Deviation, `lead` days before the first arrival after the gap, of the curve fitted after it. */
  height(lead: number): number;
  slope(lead: number): number;
  sd(lead: number): number;
  readonly rateSd: number;
}

/** Least squares with the phase step free, held loosely by the size prior. */
function backwardCurve(system: GapSystem, recovery: RecoveryColumn, widest: SizeScale): BackwardCurve {
  const { step, ramp, parabola } = system;
  const { column, target, timescaleDays, decays } = recovery;
  const sds = [1e3, widest.rate, widest.second, decays ? widest.rate : 0];
  const signs = [1, -1, -1, -1];
  const columns = [step, ramp, parabola, column].map((entries, j) => entries.map((x) => x * signs[j]! * sds[j]!));
  const normal = new Float64Array(ROWS * ROWS);
  const solution = new Float64Array(ROWS);
  for (let i = 0; i < ROWS; i++) {
    for (let j = 0; j < ROWS; j++) {
      let sum = i === j ? 1 : 0;
      for (let k = 0; k < ROWS; k++) sum += columns[i]![k]! * columns[j]![k]!;
      normal[i * ROWS + j] = sum;
    }
    for (let k = 0; k < ROWS; k++) solution[i] = solution[i]! + columns[i]![k]! * target[k]!;
  }
  choleskyFactor(normal, ROWS);
  solveLower(normal, ROWS, solution);
  solveLowerTransposed(normal, ROWS, solution);
  const [phase = 0, rate = 0, second = 0, decay = 0] = solution.map((x, j) => x * sds[j]!);
  const steepness = (lead: number): number => Math.min(STEEPEST, lead / timescaleDays);
  const sd = (direction: Float64Array): number => {
    solveLower(normal, ROWS, direction);
    return Math.hypot(...direction);
  };
  return {
    height: (lead) =>
      phase + rate * lead - 0.5 * second * lead * lead + decay * timescaleDays * Math.expm1(steepness(lead)),
    slope: (lead) => rate - second * lead + decay * Math.exp(steepness(lead)),
    sd: (lead) =>
      sd(
        Float64Array.of(
          sds[0]!,
          sds[1]! * lead,
          -0.5 * sds[2]! * lead * lead,
          sds[3]! * timescaleDays * Math.expm1(steepness(lead)),
        ),
      ),
    rateSd: sd(Float64Array.of(0, sds[1]!, 0, 0)),
  };
}

/** Whole turns that the backward curve reaches within the gap, and 0; only 0 while the rate itself is unsure. */
function admissibleShifts(heights: Float64Array, heightSd: number, driftSd: number): number[] {
  if (!(driftSd < 0.2 && heightSd < 0.1)) return [0];
  const low = Math.ceil(-Math.max(...heights) - 3 * heightSd);
  const high = Math.floor(-Math.min(...heights) + 3 * heightSd);
  const shifts = new Set([0]);
  for (let shift = low; shift <= high && shifts.size < 10_000; shift++) shifts.add(shift);
  return [...shifts].map((shift) => shift + 0);
}

/** Leads at which the curve passes `level`, by bisection within each coarse step. */
function crossings(
  leads: Float64Array,
  heights: Float64Array,
  level: number,
  height: (lead: number) => number,
): number[] {
  const found: number[] = [];
  for (let i = 1; i < leads.length; i++) {
    let low = leads[i - 1]!;
    let high = leads[i]!;
    const sign = heights[i - 1]! - level;
    if (sign * (heights[i]! - level) > 0 || heights[i - 1] === heights[i]) continue;
    for (let k = 0; k < 40; k++) {
      const middle = 0.5 * (low + high);
      if ((height(middle) - level) * sign > 0) low = middle;
      else high = middle;
    }
    found.push(0.5 * (low + high));
  }
  return found;
}
