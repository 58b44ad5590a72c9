import { choleskyFactor, solveLower } from '../math/cholesky.ts';
import { applyBasis, emptyBasis, extendBasis, type OrthogonalBasis } from '../math/orthogonalBasis.ts';
import { type CandidateGap, type EventFrame, eventColumn, reduce } from './eventFrame.ts';

/** Rows that every small system has: phase step, ramp, parabola. One more comes with each exponential. */
export const BASE_ROWS = 3;

/**
 * One candidate gap, boiled down. After the gap every glitch, wherever in the gap its epoch lies, is a combination of
 * the columns 1, s, s²/2 and τⱼ(1 − e^(−s/τⱼ)) in s = time since the first arrival after the gap. Their triangular
 * factor is all that the posterior needs, so that an epoch costs a hundred operations whatever the number of arrivals.
 */
export interface GapSystem {
  readonly gap: CandidateGap;
  readonly basis: OrthogonalBasis;
  /** Phase step, ramp, parabola: their columns of R. */
  readonly step: Float64Array;
  readonly ramp: Float64Array;
  readonly parabola: Float64Array;
  /** The data along the first three rows, and all the rest of the data. */
  readonly target: Float64Array;
  readonly rest: Float64Array;
  readonly restSquare: number;
  /** Exponentials already reduced, by timescale. */
  readonly exponentials: Map<number, Exponential>;
}

/** One exponential, reduced: its part along the first three rows, and what is left of it. */
interface Exponential {
  readonly base: Float64Array;
  readonly rest: Float64Array;
  /** Rest · rest of the data. */
  readonly alongData: number;
}

/** The exponentials of one model, as further columns of the small system. */
export interface RecoveryColumns {
  readonly timescalesDays: readonly number[];
  /** One per timescale, each with all rows. */
  readonly columns: readonly Float64Array[];
  /** The data along all rows. */
  readonly target: Float64Array;
  /** Square of what no column explains. */
  readonly restSquare: number;
}

export function gapSystem(frame: EventFrame, gap: CandidateGap): GapSystem {
  const basis = emptyBasis(frame.arrivals.length);
  const since = (power: (s: number) => number): Float64Array => {
    const column = eventColumn(frame.arrivals, gap.after, ({ tDays }) => power(tDays - gap.endDays));
    reduce(frame, column, gap.after);
    extendBasis(basis, column);
    // With fewer arrivals than rows the rest is 0.
    return Float64Array.from({ length: BASE_ROWS }, (_, row) => column[row] ?? 0);
  };
  const step = since(() => 1);
  const ramp = since((s) => s);
  const parabola = since((s) => 0.5 * s * s);
  const rest = Float64Array.from(frame.data);
  applyBasis(basis, rest);
  const target = new Float64Array(BASE_ROWS);
  for (let row = 0; row < basis.rank; row++) {
    target[row] = rest[row]!;
    rest[row] = 0;
  }
  return { gap, basis, step, ramp, parabola, target, rest, restSquare: dot(rest, rest), exponentials: new Map() };
}

/** The columns of any number of exponentials, made orthogonal among themselves. */
export function recoveryColumns(
  frame: EventFrame,
  system: GapSystem,
  timescalesDays: readonly number[],
): RecoveryColumns {
  const terms = timescalesDays.length;
  const exponentials = timescalesDays.map((timescale) => exponential(frame, system, timescale));
  const factor = new Float64Array(terms * terms);
  const along = Float64Array.from(exponentials, ({ alongData }) => alongData);
  for (let i = 0; i < terms; i++)
    for (let j = 0; j <= i; j++) factor[i * terms + j] = dot(exponentials[i]!.rest, exponentials[j]!.rest);
  choleskyFactor(factor, terms);
  solveLower(factor, terms, along);
  const target = new Float64Array(BASE_ROWS + terms);
  target.set(system.target);
  target.set(along, BASE_ROWS);
  const columns = exponentials.map(({ base }, j) => {
    const column = new Float64Array(BASE_ROWS + terms);
    column.set(base);
    for (let i = 0; i <= j; i++) column[BASE_ROWS + i] = factor[j * terms + i]!;
    return column;
  });
  return { timescalesDays, columns, target, restSquare: Math.max(0, system.restSquare - dot(along, along)) };
}

function exponential(frame: EventFrame, system: GapSystem, timescaleDays: number): Exponential {
  const known = system.exponentials.get(timescaleDays);
  if (known) return known;
  const { gap, basis } = system;
  const rest = eventColumn(
    frame.arrivals,
    gap.after,
    ({ tDays }) => -timescaleDays * Math.expm1(-(tDays - gap.endDays) / timescaleDays),
  );
  reduce(frame, rest, gap.after);
  const before = dot(rest, rest);
  applyBasis(basis, rest);
  const base = new Float64Array(BASE_ROWS);
  for (let row = 0; row < basis.rank; row++) {
    base[row] = rest[row]!;
    rest[row] = 0;
  }
  // What rounding leaves of a column that the first three explain is no column of its own.
  if (dot(rest, rest) < 1e-16 * before) rest.fill(0);
  const made = { base, rest, alongData: dot(rest, system.rest) };
  system.exponentials.set(timescaleDays, made);
  return made;
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}
