/**
 * Integration over the logarithms of one, two or three timescales by cells that are halved where the posterior lives.
 * The timescales are interchangeable, so a cell is known by its sorted corner and stands for all its permutations.
 */

export interface TimescaleCell<T> {
  readonly timescalesDays: readonly number[];
  /** ln of the prior mass of the cell: the prior is flat in ln τ over the range. */
  readonly logWeight: number;
  readonly value: T;
}

interface Cell<T> extends TimescaleCell<T> {
  readonly level: number;
  /** Corner in units of the width at this level, ascending. */
  readonly corner: readonly number[];
  /** ln of the likelihood, constant over the cell. */
  readonly height: number;
}

export interface TimescaleRange {
  readonly lowDays: number;
  readonly highDays: number;
}

/** By number of timescales: cells along each axis at first, and cells evaluated at most. */
const FIRST_CELLS = [1, 14, 8, 6] as const;
const MOST_EVALUATIONS = [1, 300, 900, 1200] as const;
/** Halvings at most: the last cells are far narrower than any timescale is ever known. */
const MOST_LEVELS = 24;
/** Cells within so many nats of the highest are looked at; those within the second number must be smooth themselves. */
const HIGH = 4;
const HIGHEST = 2;
/** Neighbours that differ by less than this, nats, need no halving. */
const SMOOTH = 1;

/**
 * Cells that tile the range. `evaluate` gives ln of the likelihood at timescales and what is to be remembered of them;
 * it is told (`refined`) when the first pass is over.
 */
export function timescaleCells<T>(
  terms: number,
  range: TimescaleRange,
  evaluate: (timescalesDays: readonly number[], refined: boolean) => { logLikelihood: number; value: T },
): TimescaleCell<T>[] {
  const lnLow = Math.log(range.lowDays);
  const lnSpan = Math.log(range.highDays / range.lowDays);
  const across = FIRST_CELLS[terms]!;
  const leaves = new Map<string, Cell<T>>();
  const addLeaf = (corner: readonly number[], level: number): void => {
    const count = across * 2 ** level;
    const timescalesDays = corner.map((i) => Math.exp(lnLow + ((i + 0.5) / count) * lnSpan));
    const logWeight = Math.log(permutations(corner)) - terms * Math.log(count);
    const { logLikelihood: height, value } = evaluate(timescalesDays, level > 0);
    leaves.set(keyOf(corner, level), {
      timescalesDays,
      logWeight,
      value,
      corner,
      level,
      height,
    });
  };
  for (const corner of corners(terms, across)) addLeaf(corner, 0);
  let left = MOST_EVALUATIONS[terms]! - leaves.size;
  while (terms > 0 && left > 0) {
    const rough = roughCells(leaves, across);
    if (rough.size === 0) break;
    for (const cell of rough) {
      leaves.delete(keyOf(cell.corner, cell.level));
      const parts = children(cell.corner);
      for (const corner of parts) addLeaf(corner, cell.level + 1);
      left -= parts.length;
    }
  }
  return [...leaves.values()];
}

/**
 * The cells to halve: near the maximum, those that differ much from a neighbour of their own width, and wider neighbours
 * that differ much. Where the likelihood is steep this walks uphill; around the maximum it goes on until all is smooth.
 */
function roughCells<T>(leaves: ReadonlyMap<string, Cell<T>>, across: number): Set<Cell<T>> {
  const cells = [...leaves.values()];
  const best = cells.reduce((most, { height }) => Math.max(most, height), Number.NEGATIVE_INFINITY);
  const rough = new Set<Cell<T>>();
  for (const cell of cells) {
    const below = best - cell.height;
    if (below > HIGH || cell.level === MOST_LEVELS) continue;
    for (const corner of neighbours(cell.corner, across * 2 ** cell.level)) {
      const neighbour = leafAround(leaves, corner, cell.level);
      if (neighbour === null || Math.abs(neighbour.height - cell.height) < SMOOTH) continue;
      if (neighbour.level < cell.level) rough.add(neighbour);
      else if (below < HIGHEST) rough.add(cell);
    }
  }
  return rough;
}

/** The leaf that holds the given cell; null where that cell has been halved itself. */
function leafAround<T>(leaves: ReadonlyMap<string, Cell<T>>, corner: readonly number[], level: number): Cell<T> | null {
  let at = corner;
  for (let l = level; l >= 0; l--) {
    const leaf = leaves.get(keyOf(at, l));
    if (leaf) return leaf;
    at = at.map((i) => Math.floor(i / 2));
  }
  return null;
}

function keyOf(corner: readonly number[], level: number): string {
  return `${level}:${corner.join()}`;
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

function children(corner: readonly number[]): number[][] {
  let list: number[][] = [[]];
  for (const i of corner) list = list.flatMap((part) => [0, 1].map((half) => [...part, 2 * i + half]));
  return distinct(list);
}

/** One step along one axis. */
function neighbours(corner: readonly number[], count: number): number[][] {
  const steps = corner.flatMap((i, axis) => [corner.with(axis, i - 1), corner.with(axis, i + 1)]);
  return distinct(steps.filter((c) => c.every((i) => i >= 0 && i < count)));
}

function distinct(list: readonly number[][]): number[][] {
  return [...new Map(list.map((corner) => corner.toSorted((a, b) => a - b)).map((c) => [c.join(), c])).values()];
}

/** In how many orders the entries of a sorted corner can stand. */
function permutations(corner: readonly number[]): number {
  let count = 1;
  let run = 0;
  corner.forEach((entry, i) => {
    run = i > 0 && entry === corner[i - 1] ? run + 1 : 1;
    count *= (i + 1) / run;
  });
  return Math.round(count);
}
