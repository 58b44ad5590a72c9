/** Uphill to a maximum of a function known only by its values, which may be a million times narrower than the first step. */

import { choleskyFactor, solveLower, solveLowerTransposed } from '../math/cholesky.ts';

export interface Maximum {
  readonly x: readonly number[];
  readonly height: number;
  /** Minus the second derivatives there, row by row. */
  readonly curvature: Float64Array;
}

const MOST_ROUNDS = 40;
/** A round goes no further along an axis than this many of the first steps; these parts of the way are looked at. */
const REACH = 2;
const PARTS_OF_THE_WAY = [1, 0.25, 0.03];
/** The next step is no smaller than this part of the last. */
const LEAST_SHRINK = 1 / 8;
/** The step becomes this part of the width of the maximum along an axis. */
const OF_WIDTH = 0.7;
/** At the top: so little is gained, and so well the step suits the width. */
const GAINED = 0.02;
const SUITS = 1.5;
const CLOSE_TO_WALL = 1e-12;

/**
 * Newton's method with derivatives from differences, in the unit cube; each round goes to the best of all places it has looked
 * at. The steps follow the width of the maximum as the curvature shows it.
 */
export function climb(
  start: readonly number[],
  firstStep: number,
  heightAt: (x: readonly number[]) => number,
): Maximum {
  const count = start.length;
  let steps: readonly number[] = start.map(() => firstStep);
  let x: readonly number[] = inside(start, steps);
  let height = heightAt(x);
  // Of all places looked at: a wall is higher than what lies before it.
  let reached = height;
  for (let round = 0; ; round++) {
    const looked = [{ x, height }];
    const look = (at: readonly number[]): number => {
      const there = heightAt(at);
      looked.push({ x: at, height: there });
      return there;
    };
    const centre = x;
    const { gradient, curvature } = derivatives(centre, height, steps, look);
    const wanted = steps.map((step, i) => {
      const bend = curvature[i * (count + 1)]!;
      return Math.min(firstStep, Math.max(LEAST_SHRINK * step, bend > 0 ? OF_WIDTH / Math.sqrt(bend) : 2 * step));
    });
    const way = newton(gradient, curvature, REACH * firstStep);
    for (const part of PARTS_OF_THE_WAY)
      look(
        inside(
          centre.map((at, i) => at + part * way[i]!),
          wanted,
        ),
      );
    const top = looked.reduce((a, b) => (b.height > a.height ? b : a));
    const suits = wanted.every((want, i) => want * SUITS > steps[i]!);
    if ((top.height - reached < GAINED && suits) || round === MOST_ROUNDS) return atTop(top, gradient, curvature);
    reached = top.height;
    steps = wanted;
    x = inside(top.x, steps);
    height = x.every((part, i) => part === top.x[i]) ? top.height : heightAt(x);
  }
}

/** Against a wall the height falls off as its slope says, not as its curvature does. */
function atTop(
  { x, height }: { readonly x: readonly number[]; readonly height: number },
  gradient: readonly number[],
  curvature: Float64Array,
): Maximum {
  const steepened = curvature.slice();
  x.forEach((part, i) => {
    const own = i * (x.length + 1);
    const atWall = Math.min(part, 1 - part) < 2 * CLOSE_TO_WALL;
    if (atWall) steepened[own] = Math.max(steepened[own]!, gradient[i]! ** 2);
  });
  return { x, height, curvature: steepened };
}

/** Far enough from the walls for a step both ways. */
function inside(x: readonly number[], steps: readonly number[]): number[] {
  return x.map((part, i) => Math.min(1 - steps[i]! - CLOSE_TO_WALL, Math.max(steps[i]! + CLOSE_TO_WALL, part)));
}

function derivatives(
  x: readonly number[],
  height: number,
  steps: readonly number[],
  look: (x: readonly number[]) => number,
): { gradient: number[]; curvature: Float64Array } {
  const count = x.length;
  const curvature = new Float64Array(count * count);
  const up = x.map((part, i) => look(x.with(i, part + steps[i]!)));
  const down = x.map((part, i) => look(x.with(i, part - steps[i]!)));
  for (let i = 0; i < count; i++) {
    curvature[i * (count + 1)] = (2 * height - up[i]! - down[i]!) / steps[i]! ** 2;
    for (let j = 0; j < i; j++) {
      const both = look(x.with(i, x[i]! + steps[i]!).with(j, x[j]! + steps[j]!));
      const mixed = (up[i]! + up[j]! - height - both) / (steps[i]! * steps[j]!);
      curvature[i * count + j] = mixed;
      curvature[j * count + i] = mixed;
    }
  }
  return { gradient: steps.map((step, i) => (up[i]! - down[i]!) / (2 * step)), curvature };
}

/** Where the parabola has its top, at most `reach` away; where it has none, uphill along each axis by itself. */
function newton(gradient: readonly number[], curvature: Float64Array, reach: number): number[] {
  const count = gradient.length;
  const factor = curvature.slice();
  const way = Float64Array.from(gradient);
  const bends = (i: number): boolean => curvature[i * (count + 1)]! > 0;
  if (gradient.every((_, i) => bends(i)) && choleskyFactor(factor, count) === count) {
    solveLower(factor, count, way);
    solveLowerTransposed(factor, count, way);
  } else
    gradient.forEach((slope, i) => {
      way[i] = bends(i) ? slope / curvature[i * (count + 1)]! : reach * Math.sign(slope);
    });
  const furthest = way.reduce((most, part) => Math.max(most, Math.abs(part)), 0);
  return Array.from(way, (part) => (furthest > reach ? (part * reach) / furthest : part));
}
