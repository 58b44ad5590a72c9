import { choleskyFactor, solveLower, solveLowerTransposed } from '../math/cholesky.ts';
import { BASE_ROWS, type GapSystem, type RecoveryColumns } from './gapSystem.ts';
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

const COARSE = 16;
const FINE = 14;
/** Beyond so many admissible shifts, every second, third … stands for its neighbours. */
const MOST_SHIFTS = 9;
/** Largest exponent in the backward extrapolation of a recovery. */
const STEEPEST = 30;

/**
 * Phase is continuous at the epoch: where the curve fitted to the arrivals after the gap, run backward, meets a whole
 * turn of the curve before it, the posterior has a peak of width σ(phase)/|Δν|. Returns grids that resolve every peak.
 * Candidate epochs are 1/Δν apart; the counts as given are shift 0.
 */
export function epochGrids({ gap: { lengthDays } }: GapSystem, curve: BackwardCurve): EpochGrid[] {
  const coarse = coarseLeads(lengthDays);
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
  for (const part of [0.02, 0.005, 0.001, 0.0002]) {
    leads.add(part * lengthDays);
    leads.add((1 - part) * lengthDays);
  }
  return Float64Array.from(leads).sort();
}

export interface BackwardCurve {
  /** Deviation, `lead` days before the first arrival after the gap, of the curve fitted after it. */
  height(lead: number): number;
  slope(lead: number): number;
  sd(lead: number): number;
  readonly rateSd: number;
}

/** Least squares with the phase step free, held loosely by the size prior. */
export function backwardCurve(system: GapSystem, recovery: RecoveryColumns, widest: SizeScale): BackwardCurve {
  const { step, ramp, parabola } = system;
  const { columns, target, timescalesDays } = recovery;
  const count = BASE_ROWS + timescalesDays.length;
  const sds = [1e3, widest.rate, widest.second, ...timescalesDays.map(() => widest.decay)];
  const scaled = [step, ramp, parabola, ...columns].map((column, j) =>
    Float64Array.from(column, (x) => (j === 0 ? x : -x) * sds[j]!),
  );
  const normal = new Float64Array(count * count);
  const solution = new Float64Array(count);
  for (let i = 0; i < count; i++) {
    for (let j = 0; j <= i; j++) normal[i * count + j] = dot(scaled[i]!, scaled[j]!) + (i === j ? 1 : 0);
    solution[i] = dot(scaled[i]!, target);
  }
  choleskyFactor(normal, count);
  solveLower(normal, count, solution);
  solveLowerTransposed(normal, count, solution);
  for (let j = 0; j < count; j++) solution[j] = solution[j]! * sds[j]!;
  const [phase = 0, rate = 0, second = 0] = solution;
  const grown = (lead: number, j: number): number =>
    timescalesDays[j]! * Math.expm1(Math.min(STEEPEST, lead / timescalesDays[j]!));
  const direction = new Float64Array(count);
  const sd = (lead: number): number => {
    direction[0] = sds[0]!;
    direction[1] = sds[1]! * lead;
    direction[2] = -0.5 * sds[2]! * lead * lead;
    for (let j = BASE_ROWS; j < count; j++) direction[j] = sds[j]! * grown(lead, j - BASE_ROWS);
    solveLower(normal, count, direction);
    return Math.hypot(...direction);
  };
  const alongRate = new Float64Array(count);
  alongRate[1] = sds[1]!;
  solveLower(normal, count, alongRate);
  return {
    height: (lead) => {
      let sum = phase + rate * lead - 0.5 * second * lead * lead;
      for (let j = BASE_ROWS; j < count; j++) sum += solution[j]! * grown(lead, j - BASE_ROWS);
      return sum;
    },
    slope: (lead) => {
      let sum = rate - second * lead;
      for (let j = BASE_ROWS; j < count; j++)
        sum += solution[j]! * Math.exp(Math.min(STEEPEST, lead / timescalesDays[j - BASE_ROWS]!));
      return sum;
    },
    sd,
    rateSd: Math.hypot(...alongRate),
  };
}

/** Over the entries of the shorter. */
function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < Math.min(a.length, b.length); i++) sum += a[i]! * b[i]!;
  return sum;
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
