import { type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';

/** A smooth function of time as one Chebyshev series for each step of equal length and each component. */
export interface ChebyshevTable {
  readonly startMjd: number;
  readonly stepDays: number;
  readonly steps: number;
  readonly components: number;
  /** Coefficients of one component in one step. */
  readonly terms: number;
  /** Step by step, within it component by component, lowest order first. */
  readonly coefficients: Float64Array;
}

export function endMjd(table: ChebyshevTable): number {
  return table.startMjd + table.steps * table.stepDays;
}

export function covers(table: ChebyshevTable, at: Mjd): boolean {
  return at.day >= table.startMjd && at.day < endMjd(table);
}

/** The value of one component; the date must be covered. */
export function chebyshevValue(table: ChebyshevTable, at: Mjd, component: number): number {
  return evaluate(table, at, component).value;
}

/** The value of one component and its rate per second; the date must be covered. */
export function chebyshevValueAndRate(
  table: ChebyshevTable,
  at: Mjd,
  component: number,
): { readonly value: number; readonly ratePerS: number } {
  return evaluate(table, at, component);
}

function evaluate(table: ChebyshevTable, at: Mjd, component: number): { value: number; ratePerS: number } {
  const { coefficients, terms, stepDays } = table;
  const step = Math.floor((at.day - table.startMjd) / stepDays);
  const x = (2 * (at.day - table.startMjd - step * stepDays + at.fraction)) / stepDays - 1;
  const { value, slope } = chebyshevSeries(coefficients, (step * table.components + component) * terms, terms, x);
  return { value, ratePerS: (2 * slope) / (stepDays * SECONDS_PER_DAY) };
}

/**
 * Σ cₖ Tₖ(x) and its derivative by x, the coefficients standing from index `first` on: Clenshaw's recurrence for the series and,
 * beside it, for its derivative.
 */
export function chebyshevSeries(
  coefficients: Float64Array,
  first: number,
  terms: number,
  x: number,
): { readonly value: number; readonly slope: number } {
  const twoX = 2 * x;
  let b1 = 0;
  let b2 = 0;
  let d1 = 0;
  let d2 = 0;
  for (let k = terms - 1; k >= 1; k--) {
    const d0 = 2 * b1 + twoX * d1 - d2;
    d2 = d1;
    d1 = d0;
    const b0 = coefficients[first + k]! + twoX * b1 - b2;
    b2 = b1;
    b1 = b0;
  }
  return { value: coefficients[first]! + x * b1 - b2, slope: b1 + x * d1 - d2 };
}
