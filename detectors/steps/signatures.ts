/**
 * What a step in each recent gap would have done to the innovations of the null, for all gaps at once.
 *
 * A step G shifts the filter's error: D ← F D over a gap; an arrival sees s = h D, and D ← D − K s. With C = Σ s sᵀ/S and
 * d = Σ s e/S the log Bayes factor of a Gaussian step of covariance L Lᵀ is −½ ln|I + LᵀCL| + ½ bᵀ(I + LᵀCL)⁻¹b, b = Lᵀd:
 * exact for a linear filter with one count of turns, some thirty multiplications a gap (Willsky & Jones 1976, IEEE
 * Trans. Automatic Control 21, 108).
 *
 * All gaps stand side by side in each array, so that the loops over them are long and the cost is that of the arithmetic.
 */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import type { Gap, Prediction, Sight } from './hypothesis.ts';

export interface Signatures {
  readonly states: number;
  /** Directions in which a step may go: the spin states, then what the gaps name. */
  readonly directions: number;
  readonly capacity: number;
  /** Gaps in use are at first…end−1, oldest first. */
  first: number;
  end: number;
  /** D: (direction × states + state) × capacity + gap. */
  readonly errors: Float64Array;
  /** C, lower triangle: pair × capacity + gap; and d: direction × capacity + gap. */
  readonly information: Float64Array;
  readonly score: Float64Array;
  /** s of the arrival in hand: direction × capacity + gap. */
  readonly shift: Float64Array;
}

const FIRST_CAPACITY = 32;

export function newSignatures(states: number, directions: number = SPIN_STATES, capacity = FIRST_CAPACITY): Signatures {
  return {
    states,
    directions,
    capacity,
    first: 0,
    end: 0,
    errors: new Float64Array(directions * states * capacity),
    information: new Float64Array(((directions * (directions + 1)) / 2) * capacity),
    score: new Float64Array(directions * capacity),
    shift: new Float64Array(directions * capacity),
  };
}

/** The same signatures with room for more states, directions or gaps; what is new is zero. */
export function withRoom(from: Signatures, states: number, directions: number, capacity = from.capacity): Signatures {
  const into = newSignatures(states, directions, capacity);
  const count = from.end - from.first;
  into.end = count;
  const copy = (source: Float64Array, row: number, target: Float64Array, targetRow: number): void => {
    const at = row * from.capacity + from.first;
    target.set(source.subarray(at, at + count), targetRow * capacity);
  };
  for (let c = 0; c < from.directions; c++) {
    for (let i = 0; i < from.states; i++) copy(from.errors, c * from.states + i, into.errors, c * states + i);
    copy(from.score, c, into.score, c);
  }
  const pairs = (from.directions * (from.directions + 1)) / 2;
  for (let pair = 0; pair < pairs; pair++) copy(from.information, pair, into.information, pair);
  return into;
}

/** One more gap, whose step may go along the spin states and the given directions; returns the signatures, moved if need be. */
export function addGap(from: Signatures, extra: readonly (readonly number[])[]): Signatures {
  const directions = Math.max(from.directions, SPIN_STATES + extra.length);
  const full = from.end === from.capacity;
  const crowded = from.end - from.first > from.capacity / 2;
  const moved = full || directions > from.directions;
  const into = moved ? withRoom(from, from.states, directions, from.capacity * (full && crowded ? 2 : 1)) : from;
  const { states, capacity, errors } = into;
  const slot = into.end++;
  for (let i = 0; i < SPIN_STATES; i++) errors[(i * states + i) * capacity + slot] = 1;
  extra.forEach((direction, k) => {
    for (let i = 0; i < states; i++) errors[((SPIN_STATES + k) * states + i) * capacity + slot] = direction[i]!;
  });
  return into;
}

/** D ← F D. */
export function carryOver({ states, directions, capacity, first, end, errors }: Signatures, gap: Gap): void {
  const t = gap.days;
  const half = (t * t) / 2;
  for (let c = 0; c < directions; c++) {
    const deviation = c * states * capacity;
    const rate = deviation + capacity;
    const second = rate + capacity;
    for (let g = first; g < end; g++) {
      const r = errors[rate + g]!;
      const q = errors[second + g]!;
      errors[deviation + g]! += t * r + half * q;
      errors[rate + g] = r + t * q;
    }
    for (const { state, turnsPerRate, kept } of gap.decays) {
      const decay = deviation + state * capacity;
      for (let g = first; g < end; g++) {
        errors[deviation + g]! += turnsPerRate * errors[decay + g]!;
        errors[decay + g]! *= kept;
      }
    }
  }
}

/** s = h D for every gap. */
export function see({ states, directions, capacity, first, end, errors, shift }: Signatures, sight: Sight): void {
  for (let c = 0; c < directions; c++) {
    const into = c * capacity;
    shift.fill(0, into + first, into + end);
    for (const state of sight.seen) {
      const factor = sight.row[state]!;
      const from = (c * states + state) * capacity;
      for (let g = first; g < end; g++) shift[into + g]! += factor * errors[from + g]!;
    }
  }
}

/** C ← C + s sᵀ/S, d ← d + s e/S for the arrival last seen; with `sign` −1 it is taken out again. */
export function count(signatures: Signatures, innovation: number, variance: number, sign: 1 | -1 = 1): void {
  const { directions, capacity, first, end, information, score, shift } = signatures;
  const weight = sign / variance;
  const pull = innovation * weight;
  let pair = 0;
  for (let a = 0; a < directions; a++) {
    const left = a * capacity;
    for (let g = first; g < end; g++) score[left + g]! += pull * shift[left + g]!;
    for (let b = 0; b <= a; b++, pair++) {
      const right = b * capacity;
      const into = pair * capacity;
      for (let g = first; g < end; g++) information[into + g]! += weight * shift[left + g]! * shift[right + g]!;
    }
  }
}

/** D ← D − K s: the null has absorbed the arrival with P·h = `gain` and innovation variance S. */
export function absorbInto(signatures: Signatures, { gain }: Prediction, variance: number): void {
  const { states, directions, capacity, first, end, errors, shift } = signatures;
  for (let c = 0; c < directions; c++) {
    const from = c * capacity;
    for (let i = 0; i < states; i++) {
      const k = gain[i]! / variance;
      if (k === 0) continue;
      const into = (c * states + i) * capacity;
      for (let g = first; g < end; g++) errors[into + g]! -= k * shift[from + g]!;
    }
  }
}

/** Root L of the covariance of a step: column after column over the directions. */
export interface Root {
  readonly rank: number;
  readonly directions: number;
  readonly columns: Float64Array;
}

const MOST = 12;
const projected = new Float64Array(MOST);
const matrix = new Float64Array(MOST * MOST);

/** ln of P(arrivals | a step of this root in the gap) over P(arrivals | none). */
export function logBayesFactor(signatures: Signatures, position: number, { rank, directions, columns }: Root): number {
  const { capacity, information, score } = signatures;
  const slot = signatures.first + position;
  for (let p = 0; p < rank; p++) {
    let b = 0;
    for (let a = 0; a < directions; a++) {
      const root = columns[p * directions + a]!;
      if (root !== 0) b += root * score[a * capacity + slot]!;
    }
    projected[p] = b;
    for (let q = 0; q <= p; q++) {
      let sum = p === q ? 1 : 0;
      for (let a = 0; a < directions; a++) {
        const left = columns[p * directions + a]!;
        if (left === 0) continue;
        for (let c = 0; c < directions; c++) {
          const pair = a > c ? (a * (a + 1)) / 2 + c : (c * (c + 1)) / 2 + a;
          sum += left * columns[q * directions + c]! * information[pair * capacity + slot]!;
        }
      }
      matrix[p * MOST + q] = sum;
    }
  }
  return gaussianEvidence(rank);
}

/** Directions that have been told of at all, and the roots of their own information. */
const told = new Int32Array(MOST);
const units = new Float64Array(MOST);
/** Directions that nothing tells apart yet would divide by nothing: a trace of a prior, relative to their own information. */
const TRACE = 1e-9;

/** ½ dᵀC⁻¹d: no step, of whatever size, fits better than this. */
export function highestLogRatio(signatures: Signatures, position: number): number {
  const { directions, capacity, information, score } = signatures;
  const slot = signatures.first + position;
  let rank = 0;
  for (let a = 0; a < directions; a++) {
    const own = information[((a * (a + 1)) / 2 + a) * capacity + slot]!;
    if (own <= 0) continue;
    const unit = Math.sqrt(own);
    told[rank] = a;
    units[rank] = unit;
    projected[rank] = score[a * capacity + slot]! / unit;
    for (let q = 0; q < rank; q++)
      matrix[rank * MOST + q] = information[((a * (a + 1)) / 2 + told[q]!) * capacity + slot]! / (unit * units[q]!);
    matrix[rank * MOST + rank] = 1 + TRACE;
    rank++;
  }
  return gaussianExponent(rank);
}

/** Cholesky of `matrix` in place, `projected` solved beside it; ½ bᵀM⁻¹b. */
function gaussianExponent(rank: number): number {
  let exponent = 0;
  for (let p = 0; p < rank; p++) {
    let b = projected[p]!;
    for (let q = 0; q <= p; q++) {
      let sum = matrix[p * MOST + q]!;
      for (let k = 0; k < q; k++) sum -= matrix[p * MOST + k]! * matrix[q * MOST + k]!;
      if (q < p) {
        sum /= matrix[q * MOST + q]!;
        b -= sum * projected[q]!;
        matrix[p * MOST + q] = sum;
      } else matrix[p * MOST + p] = Math.sqrt(Math.max(sum, TRACE));
    }
    b /= matrix[p * MOST + p]!;
    projected[p] = b;
    exponent += 0.5 * b * b;
  }
  return exponent;
}

function gaussianEvidence(rank: number): number {
  let evidence = gaussianExponent(rank);
  for (let p = 0; p < rank; p++) evidence -= Math.log(matrix[p * MOST + p]!);
  return evidence;
}
