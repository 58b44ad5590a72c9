import { applyBasis, emptyBasis, extendBasis, type OrthogonalBasis } from '../math/orthogonalBasis.ts';
import { type CandidateGap, type EventFrame, eventColumn, reduce } from './eventFrame.ts';

/** Rows of the small system: phase step, ramp, parabola, exponential. */
export const ROWS = 4;

/**
 * One candidate gap, boiled down. After the gap every glitch, wherever in the gap its epoch lies, is a combination of
 * four columns in s = time since the first arrival after the gap: 1, s, s²/2 and τ(1 − e^(−s/τ)). Their triangular
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
}

/** The exponential's part for one timescale; without one, zeros. */
export interface RecoveryColumn {
  readonly timescaleDays: number;
  readonly decays: boolean;
  readonly column: Float64Array;
  /** The data along all four rows. */
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
    const rows = new Float64Array(ROWS);
    rows.set(column.subarray(0, ROWS));
    return rows;
  };
  const step = since(() => 1);
  const ramp = since((s) => s);
  const parabola = since((s) => 0.5 * s * s);
  const rest = Float64Array.from(frame.data);
  applyBasis(basis, rest);
  const target = new Float64Array(ROWS);
  for (let row = 0; row < basis.rank; row++) {
    target[row] = rest[row]!;
    rest[row] = 0;
  }
  return { gap, basis, step, ramp, parabola, target, rest, restSquare: dot(rest, rest) };
}

export function withoutRecovery(system: GapSystem): RecoveryColumn {
  return {
    timescaleDays: 1,
    decays: false,
    column: new Float64Array(ROWS),
    target: system.target,
    restSquare: system.restSquare,
  };
}

export function recoveryColumn(frame: EventFrame, system: GapSystem, timescaleDays: number): RecoveryColumn {
  const { gap, basis, rest } = system;
  const full = eventColumn(
    frame.arrivals,
    gap.after,
    ({ tDays }) => -timescaleDays * Math.expm1(-(tDays - gap.endDays) / timescaleDays),
  );
  reduce(frame, full, gap.after);
  const before = dot(full, full);
  applyBasis(basis, full);
  const column = new Float64Array(ROWS);
  for (let row = 0; row < basis.rank; row++) {
    column[row] = full[row]!;
    full[row] = 0;
  }
  const target = Float64Array.from(system.target);
  const own = dot(full, full);
  let restSquare = system.restSquare;
  if (own > 1e-16 * before) {
    const length = Math.sqrt(own);
    column[ROWS - 1] = length;
    target[ROWS - 1] = dot(full, rest) / length;
    restSquare = Math.max(0, restSquare - target[ROWS - 1]! ** 2);
  }
  return { timescaleDays, decays: true, column, target, restSquare };
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}
