/**
 * Integration over the logarithms of one, two or three timescales: from the best of some coarse cells uphill to a maximum, and
 * from there over a lattice shaped like the maximum, as far as there is weight. The sum over a lattice finer than the width of
 * a peak is nearly exact, however narrow the peak. The timescales are interchangeable: ascending ones stand for all orders.
 */

import { choleskyFactor, solveLowerTransposed } from '../math/cholesky.ts';
import { climb, type Maximum } from './climb.ts';

export interface TimescaleCell<T> {
  readonly timescalesDays: readonly number[];
  /** ln of the prior mass of the cell: the prior is flat in ln τ over the range. */
  readonly logWeight: number;
  readonly value: T;
}

/** The cells around one maximum. */
export interface TimescaleLattice<T> {
  readonly cells: readonly TimescaleCell<T>[];
  /** Along each axis: sd, in ln τ, of the neighbourhood that one cell stands for. */
  readonly cellSds: readonly number[];
}

export interface TimescaleRange {
  readonly lowDays: number;
  readonly highDays: number;
}

/** What a set of timescales is looked at for: to find the way; the middle of a lattice, and the rest of it, exactly. */
export type Stage = 'coarse' | 'uphill' | 'maximum' | 'lattice';

/** `height`: ln of the likelihood. */
export type Evaluate<T> = (timescalesDays: readonly number[], stage: Stage) => { height: number; value: T };

/** By number of timescales: coarse cells along each axis, lattice steps in standard deviations, points of a lattice at most. */
const COARSE = [1, 14, 8, 6] as const;
const STEP = [1, 0.5, 0.8, 1] as const;
const MOST_POINTS = [1, 60, 150, 220] as const;
/** Maxima that a climb is begun for. */
const MOST_MAXIMA = 2;
/** What is so many nats below the highest maximum is left out. */
const NEGLIGIBLE = 7;

/** A lattice in the making, in ln τ as a part of the range. */
interface Lattice<T> {
  readonly maximum: Maximum;
  /** Lower triangular L: the points are x = maximum + step L⁻ᵀ k for whole k. */
  readonly factor: Float64Array;
  readonly step: number;
  readonly cells: Map<
    string,
    { readonly k: readonly number[]; readonly height: number; readonly value: T; readonly x: readonly number[] }
  >;
}

/** By maximum; together they hold all but a thousandth of the weight. */
export function timescaleLattices<T>(
  terms: number,
  range: TimescaleRange,
  evaluate: Evaluate<T>,
): TimescaleLattice<T>[] {
  const lnLow = Math.log(range.lowDays);
  const lnSpan = Math.log(range.highDays / range.lowDays);
  const timescalesOf = (x: readonly number[]) => x.map((part) => Math.exp(lnLow + part * lnSpan));
  if (terms === 0) {
    return [{ cells: [{ timescalesDays: [], logWeight: 0, value: evaluate([], 'maximum').value }], cellSds: [] }];
  }
  const across = COARSE[terms]!;
  const starts = coarseMaxima(terms, across, (x) => evaluate(timescalesOf(x), 'coarse').height);
  const uphill = (x: readonly number[]) => evaluate(timescalesOf(x), 'uphill').height;
  const lattices: Lattice<T>[] = [];
  let highest = Number.NEGATIVE_INFINITY;
  for (const start of starts) {
    const maximum = ascending(climb(start, 0.5 / across, uphill));
    if (maximum.height < highest - NEGLIGIBLE || lattices.some((lattice) => covers(lattice, maximum.x))) continue;
    highest = Math.max(highest, maximum.height);
    lattices.push(spread(maximum, across, lattices, (x, stage) => evaluate(timescalesOf(x), stage)));
  }
  return lattices.map((lattice) => {
    const logVolume = terms * Math.log(lattice.step) - logDeterminant(lattice.factor, terms);
    const cells = [...lattice.cells.values()].map(({ x, value }) => ({
      timescalesDays: timescalesOf(x),
      logWeight: logVolume + Math.log(orders(x)),
      value,
    }));
    return { cells, cellSds: extentOf(lattice).map((extent) => 0.5 * lnSpan * extent) };
  });
}

/** Middles of the coarse cells that are higher than their neighbours, highest first. */
function coarseMaxima(terms: number, across: number, heightAt: (x: readonly number[]) => number): number[][] {
  const heights = new Map<string, { corner: number[]; height: number }>();
  for (const corner of corners(terms, across))
    heights.set(corner.join(), { corner, height: heightAt(corner.map((i) => (i + 0.5) / across)) });
  return [...heights.values()]
    .filter(({ corner, height }) =>
      neighbours(corner).every((next) => {
        const there = heights.get(next.toSorted((a, b) => a - b).join());
        return there === undefined || there.height <= height;
      }),
    )
    .sort((a, b) => b.height - a.height)
    .slice(0, MOST_MAXIMA)
    .map(({ corner }) => corner.map((i) => (i + 0.5) / across));
}

/** The same maximum with the timescales in ascending order. */
function ascending({ x, height, curvature }: Maximum): Maximum {
  const order = x.map((_, i) => i).sort((a, b) => x[a]! - x[b]!);
  return {
    x: order.map((i) => x[i]!),
    height,
    curvature: Float64Array.from(order.flatMap((i) => order.map((j) => curvature[i * x.length + j]!))),
  };
}

/** From the maximum outward, highest first, as far as there is weight. */
function spread<T>(
  maximum: Maximum,
  across: number,
  others: readonly Lattice<T>[],
  evaluate: (x: readonly number[], stage: Stage) => { height: number; value: T },
): Lattice<T> {
  const terms = maximum.x.length;
  const step = STEP[terms]!;
  const lattice: Lattice<T> = { maximum, factor: shapeOf(maximum, step * across), step, cells: new Map() };
  const origin = maximum.x.map(() => 0);
  const seen = new Set([origin.join()]);
  const waiting: { k: readonly number[]; from: number }[] = [{ k: origin, from: Number.POSITIVE_INFINITY }];
  let best = Number.NEGATIVE_INFINITY;
  while (waiting.length > 0 && lattice.cells.size < MOST_POINTS[terms]!) {
    const next = waiting.reduce((top, { from }, i) => (from > waiting[top]!.from ? i : top), 0);
    const { k } = waiting.splice(next, 1)[0]!;
    const x = placeOf(lattice, k);
    if (!x.every((part, i) => part >= (i === 0 ? 0 : x[i - 1]!) && part <= 1)) continue;
    if (others.some((other) => covers(other, x))) continue;
    const { height, value } = evaluate(x, lattice.cells.size === 0 ? 'maximum' : 'lattice');
    if (height < best - NEGLIGIBLE) continue;
    best = Math.max(best, height);
    lattice.cells.set(k.join(), { k, height, value, x });
    for (const neighbour of neighbours(k)) {
      const key = neighbour.join();
      if (seen.has(key)) continue;
      seen.add(key);
      waiting.push({ k: neighbour, from: height });
    }
  }
  return lattice;
}

/** Cholesky factor of minus the second derivatives, no flatter than one coarse cell a step; without correlations if need be. */
function shapeOf({ curvature }: Maximum, flattest: number): Float64Array {
  const terms = Math.sqrt(curvature.length);
  const factor = Float64Array.from(curvature);
  for (let i = 0; i < terms; i++) factor[i * (terms + 1)] = Math.max(0, factor[i * (terms + 1)]!) + flattest ** 2;
  choleskyFactor(factor, terms);
  const sound = Array.from({ length: terms }, (_, i) => factor[i * (terms + 1)]! > 0.5 * flattest).every(Boolean);
  if (sound) return factor;
  const straight = new Float64Array(terms * terms);
  for (let i = 0; i < terms; i++)
    straight[i * (terms + 1)] = Math.sqrt(Math.max(0, curvature[i * (terms + 1)]!) + flattest ** 2);
  return straight;
}

function placeOf<T>({ maximum, factor, step }: Lattice<T>, k: readonly number[]): number[] {
  const away = Float64Array.from(k, (whole) => step * whole);
  solveLowerTransposed(factor, k.length, away);
  return maximum.x.map((part, i) => part + away[i]!);
}

/** Along each axis, the root of the sum of squares of what one step along each of the lattice's own axes moves. */
function extentOf<T>({ factor, step, maximum }: Lattice<T>): number[] {
  const squares = maximum.x.map(() => 0);
  for (let axis = 0; axis < squares.length; axis++) {
    const way = Float64Array.from(squares, (_, i) => (i === axis ? step : 0));
    solveLowerTransposed(factor, squares.length, way);
    way.forEach((part, i) => {
      squares[i]! += part * part;
    });
  }
  return squares.map(Math.sqrt);
}

/** Whether the place lies in a cell of the lattice. */
function covers<T>({ maximum, factor, step, cells }: Lattice<T>, x: readonly number[]): boolean {
  const terms = x.length;
  const k = x.map((_, i) => {
    let sum = 0;
    for (let j = i; j < terms; j++) sum += factor[j * terms + i]! * (x[j]! - maximum.x[j]!);
    return Math.round(sum / step) + 0;
  });
  return cells.has(k.join());
}

/** One step along one axis. */
function neighbours(k: readonly number[]): number[][] {
  return k.flatMap((i, axis) => [k.with(axis, i - 1), k.with(axis, i + 1)]);
}

/** All corners with ascending entries below `across`. */
function corners(terms: number, across: number): number[][] {
  let list: number[][] = [[]];
  for (let axis = 0; axis < terms; axis++)
    list = list.flatMap((corner) => {
      const least = corner.at(-1) ?? 0;
      return Array.from({ length: across - least }, (_, i) => [...corner, least + i]);
    });
  return list;
}

function logDeterminant(factor: Float64Array, terms: number): number {
  let sum = 0;
  for (let i = 0; i < terms; i++) sum += Math.log(factor[i * (terms + 1)]!);
  return sum;
}

/** In how many orders ascending timescales can stand; alike are those that only rounding tells apart. */
function orders(x: readonly number[]): number {
  let count = 1;
  let alike = 1;
  x.forEach((part, i) => {
    alike = i > 0 && part - x[i - 1]! < 1e-9 ? alike + 1 : 1;
    count *= (i + 1) / alike;
  });
  return count;
}
