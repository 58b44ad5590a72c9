/**
 * The explanations that may enter at a gap: how often each happens, how large it is, and which states it sets free.
 * A hypothesis is born as a mixture of sizes, so that a step of 1e-9 and one of 1e-6 of ν are both expected.
 */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import { copyOf, type Hypothesis, loosen } from './hypothesis.ts';
import type { Modes } from './switchingRecord.ts';

export const KINDS = ['glitch', 'spin-down-rate change', 'clock step', 'dispersion step'] as const;
export type Kind = (typeof KINDS)[number];
/** What a record may say has happened: one of the kinds that are born, or that the count of turns was lost. */
export type Cause = Kind | 'lost count';

/**
 * Events per year of one pulsar. Glitch: 107 in 1911 pulsar-years (Yu et al. 2013, MNRAS 429, 688). The others: common
 * practice, no source; rare enough that two independent sessions must speak for them. Spin-down-rate change: 17 of 366 pulsars
 * were seen to change in some twenty years (Lyne et al. 2010, Science 329, 408; from memory). One that is known to switch
 * has a rate of its own.
 */
export const RATE_PER_YEAR: Readonly<Record<Cause, number>> = {
  glitch: 0.056,
  'spin-down-rate change': 0.002,
  'clock step': 0.03,
  'dispersion step': 0.02,
  'lost count': 0.05,
};
const DAYS_PER_YEAR = 365.25;
const SECONDS_PER_DAY = 86_400;

/**
 * Of a glitch: share of each size, σ of Δν/ν; the published sizes peak at 1e-9 and 1e-6 (Yu et al. 2013), and the smallest are
 * what could just be seen.
 */
export const GLITCH_SIZES: readonly (readonly [share: number, size: number])[] = [
  [0.1, 6e-11],
  [0.2, 5e-10],
  [0.2, 4e-9],
  [0.2, 4e-8],
  [0.12, 4e-7],
  [0.13, 3e-6],
  [0.05, 2e-5],
];
/** σ of Δν̇/ν̇ at a glitch (from memory of published tables: 1e-4 to a few 1e-2). */
export const GLITCH_RATE_SIZE = 1e-2;
/** σ of Δν̇/ν̇ of a change alone: most are of 0.3 to 13 % (Lyne et al. 2010; from memory). */
const RATE_CHANGE_SIZES: readonly (readonly [number, number])[] = [
  [0.45, 2e-3],
  [0.45, 2e-2],
  [0.1, 0.2],
];
/** σ of a step of the clock, seconds. */
const CLOCK_SIZES: readonly (readonly [number, number])[] = [
  [0.35, 3e-5],
  [0.35, 1e-3],
  [0.3, 1],
];
/** σ of a step in dispersion, pc cm⁻³. */
const DISPERSION_SIZES: readonly (readonly [number, number])[] = [
  [0.6, 3e-3],
  [0.4, 0.1],
];
/** A step of many periods leaves the deviation anywhere within a turn. */
const WRAPPED_SPREAD_TURNS = 0.3;
/** A step that would spread the deviation over more turns than this within the gap is left to the circular search. */
const SPREAD_LIMIT_TURNS = 0.7;

/** What the births need to know of the pulsar and of the arrival after the gap. */
export interface BirthPlace {
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  readonly gapDays: number;
  /** Directions in state space of a time offset of the arrival's site, and of its receiver alone where that differs. */
  readonly offsetDirections: readonly (readonly number[])[];
  /** Direction of one turn of dispersion at 1 GHz; null while only one band is known. */
  readonly dispersionDirection: readonly number[] | null;
  /** Turns at 1 GHz per pc cm⁻³. */
  readonly turnsPerDispersion: number;
  /** Of a pulsar known to switch between two spin-down rates. */
  readonly modes: Modes | null;
  /** The whole turns after the gap are decided: any size may be tried. */
  readonly countKnown: boolean;
}

/** The same place after a state was added: no step of before goes along it. */
export function widened(place: BirthPlace): BirthPlace {
  const { offsetDirections, dispersionDirection } = place;
  return {
    ...place,
    offsetDirections: offsetDirections.map((direction) => [...direction, 0]),
    dispersionDirection: dispersionDirection === null ? null : [...dispersionDirection, 0],
  };
}

const ANY_PER_YEAR = KINDS.reduce((sum, kind) => sum + RATE_PER_YEAR[kind], 0);

/** Natural log of how many events of any kind are expected in the gap. */
export function logRateOfAny({ gapDays, modes }: BirthPlace): number {
  return Math.log(((ANY_PER_YEAR + (modes?.switchesPerYear ?? 0)) * gapDays) / DAYS_PER_YEAR);
}

/** Children of one hypothesis (its state just before the arrival after the gap), weighted by the prior. */
export function born(kind: Cause, parent: Hypothesis, place: BirthPlace): Hypothesis[] {
  const logRate = Math.log((RATE_PER_YEAR[kind] * place.gapDays) / DAYS_PER_YEAR);
  const children: Hypothesis[] = [];
  const add = (share: number, change: (h: Hypothesis) => void) => {
    const child = copyOf(parent);
    child.logWeight += logRate + Math.log(share);
    change(child);
    children.push(child);
  };
  switch (kind) {
    case 'glitch':
      for (const [share, size] of GLITCH_SIZES) {
        const rateTurns = size * place.frequencyHz * SECONDS_PER_DAY;
        if (place.countKnown || rateTurns * place.gapDays < SPREAD_LIMIT_TURNS)
          add(share, (h) => glitch(h, rateTurns, place));
      }
      break;
    case 'spin-down-rate change':
      for (const [share, size] of RATE_CHANGE_SIZES) add(share, (h) => rateChange(h, size, place));
      if (place.modes !== null) {
        const { stepTurns, switchesPerYear } = place.modes;
        add(switchesPerYear / RATE_PER_YEAR[kind], (h) => freeSecond(h, stepTurns));
      }
      break;
    case 'clock step':
      for (const direction of place.offsetDirections)
        for (const [share, size] of CLOCK_SIZES)
          add(share / place.offsetDirections.length, (h) =>
            loosen(h, direction, Math.min(size * place.frequencyHz, WRAPPED_SPREAD_TURNS) ** 2),
          );
      break;
    case 'dispersion step':
      if (place.dispersionDirection !== null)
        for (const [share, size] of DISPERSION_SIZES)
          add(share, (h) => loosen(h, place.dispersionDirection!, (size * place.turnsPerDispersion) ** 2));
      break;
    case 'lost count':
      add(1, (h) => loseCount(h, place));
      break;
  }
  return children;
}

/** A rate step somewhere in the gap: the deviation at its end has moved by the step times the rest of the gap. */
export function glitch(h: Hypothesis, rateTurns: number, place: BirthPlace): void {
  const size = h.mean.length;
  const variance = rateTurns * rateTurns;
  const { gapDays } = place;
  h.cov[0]! += (variance * gapDays * gapDays) / 3;
  h.cov[1]! += (variance * gapDays) / 2;
  h.cov[size]! += (variance * gapDays) / 2;
  h.cov[size + 1]! += variance;
  rateChange(h, GLITCH_RATE_SIZE, place);
}

/** σ of Δν/ν across a loss of the count: a glitch may hide in it. */
const LOST_SIZE = 2e-5;
/** σ of the deviation after it: any number of turns, for numbers near 1. */
const LOST_TURNS = 10;

/** Nothing of the rotation before the gap is held against the arrivals after it. */
export function loseCount(h: Hypothesis, place: BirthPlace): void {
  h.cov[0]! += LOST_TURNS ** 2;
  glitch(h, LOST_SIZE * place.frequencyHz * SECONDS_PER_DAY, place);
}

function rateChange(h: Hypothesis, relativeSize: number, place: BirthPlace): void {
  freeSecond(h, relativeSize * Math.abs(place.frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2);
}

/** `step`: σ of a step in the second derivative, turns/day². */
export function freeSecond(h: Hypothesis, step: number): void {
  h.cov[(SPIN_STATES - 1) * (h.mean.length + 1)]! += step * step;
}
