/**
 * The sizes that each kind of step may have, as the signatures need them: shares, and roots of covariances over directions.
 * They are read off `born` itself, by letting it act on a state that is known exactly: what it sets free is the step. So a kind
 * need be told once, in births.ts, as long as it frees states where the gap ends.
 */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import { type BirthPlace, born, type Kind } from './births.ts';
import { type Hypothesis, zeros } from './hypothesis.ts';
import type { Root } from './signatures.ts';

export interface StepSize {
  /** Natural log of rate × share. */
  readonly logPrior: number;
  readonly root: Root;
}

/** Orthonormal directions beyond the spin states that a step at this place may take. */
export function furtherDirections(place: BirthPlace): readonly (readonly number[])[] {
  const found: number[][] = [];
  const { dispersionDirection } = place;
  const named =
    dispersionDirection === null ? place.offsetDirections : [...place.offsetDirections, dispersionDirection];
  for (const direction of named) {
    if (direction.length === SPIN_STATES) continue;
    // The spin states have directions of their own.
    const rest = direction.map((x, i) => (i < SPIN_STATES ? 0 : x));
    const before = Math.hypot(...rest);
    for (const other of found) {
      const along = dot(rest, other);
      for (let i = 0; i < rest.length; i++) rest[i]! -= along * other[i]!;
    }
    const length = Math.hypot(...rest);
    if (length > 1e-9 * before) found.push(rest.map((x) => x / length));
  }
  return found;
}

function dot(a: readonly number[], b: readonly number[]): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}

export function stepSizes(
  kind: Kind,
  place: BirthPlace,
  further: readonly (readonly number[])[],
  states: number,
): StepSize[] {
  return born(kind, certain(states), place).map((child) => ({
    logPrior: child.logWeight,
    root: rootOf(child.cov, states, further),
  }));
}

/** A state without any uncertainty, of weight one. */
function certain(states: number): Hypothesis {
  const cov = zeros(states * states);
  return { mean: zeros(states), cov, logWeight: 0, story: null, tracks: [], lastSetAside: false, numbering: null };
}

/** Cholesky root over the directions; what a step does not free has no column. */
function rootOf(cov: readonly number[], states: number, further: readonly (readonly number[])[]): Root {
  const directions = SPIN_STATES + further.length;
  const left = overDirections(cov, states, further);
  const columns: number[] = [];
  for (let p = 0; p < directions; p++) {
    const own = left[p * directions + p]!;
    if (!(own > 1e-12 * along(cov, states, further, p, p))) continue;
    const pivot = Math.sqrt(own);
    const at = columns.length;
    for (let a = 0; a < directions; a++) columns.push(a < p ? 0 : left[a * directions + p]! / pivot);
    for (let a = p; a < directions; a++)
      for (let b = p; b < directions; b++) left[a * directions + b]! -= columns[at + a]! * columns[at + b]!;
  }
  return { rank: columns.length / directions, directions, columns: Float64Array.from(columns) };
}

/** The covariance of the components along each pair of directions. */
function overDirections(cov: readonly number[], states: number, further: readonly (readonly number[])[]): Float64Array {
  const directions = SPIN_STATES + further.length;
  const into = new Float64Array(directions * directions);
  for (let a = 0; a < directions; a++)
    for (let b = 0; b <= a; b++) {
      const value = along(cov, states, further, a, b);
      into[a * directions + b] = value;
      into[b * directions + a] = value;
    }
  return into;
}

function along(
  cov: readonly number[],
  states: number,
  further: readonly (readonly number[])[],
  a: number,
  b: number,
): number {
  const left = further[a - SPIN_STATES];
  const right = further[b - SPIN_STATES];
  let sum = 0;
  for (let i = left === undefined ? a : 0; i < (left === undefined ? a + 1 : states); i++)
    for (let j = right === undefined ? b : 0; j < (right === undefined ? b + 1 : states); j++)
      sum += (left?.[i] ?? 1) * cov[i * states + j]! * (right?.[j] ?? 1);
  return sum;
}
