/**
 * How often to observe after a glitch, and what each night buys: expected σ of Δν, Δν̇, Q and τ from the Fisher information of
 * the glitch model, linearised at the sizes of today, whitened with the learned noise. Arrivals that exist count too.
 */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { nuisanceLayout, writeSensitivity } from '../filter/nuisance.ts';
import { arrivalVariance } from '../filter/stateSpace.ts';
import { absorbArrival, createWhiteningFilter, expectArrival, predict } from '../filter/whiteningFilter.ts';
import { asArrivals } from '../limits/programme.ts';
import { choleskyFactor, solveLower } from '../math/cholesky.ts';
import { median } from '../math/median.ts';
import type { PulsarEvent } from '../steps/pulsarEvent.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { mjdNumber } from '../time/mjd.ts';
import { nextUsualTime, SIDEREAL_DAY } from './ahead.ts';

export interface RecoveryPlan {
  readonly event: string;
  /** The recovery for which the plan is made; `assumed`: none is established, and this one stands for it. */
  readonly q: number;
  readonly timescaleDays: number;
  readonly assumed: boolean;
  readonly now: ExpectedWidths;
  readonly schedules: readonly Schedule[];
  /** Name of the schedule with the fewest nights among those that do nearly as well as the best. */
  readonly recommended: string;
  /** Of the recommended schedule: what is known after each night. */
  readonly nights: readonly { readonly mjd: number; readonly widths: ExpectedWidths }[];
}

export interface Schedule {
  readonly name: string;
  readonly nights: number;
  readonly widths: ExpectedWidths;
}

/** Half-widths of the expected 68 % intervals; infinite values are null: not constrained. */
export interface ExpectedWidths {
  readonly deltaNuHz: number | null;
  readonly deltaNuDotHzPerS: number | null;
  readonly q: number | null;
  readonly timescaleDays: number | null;
}

const DAYS_AHEAD = 30;
const REGULAR_DAYS = [1, 2, 3, 5, 7, 10, 15];
/** Nights after the first, each about 1.5 times as long after the start of the plan as the one before. */
const FRONT_LOADED_DAYS = [0, 1, 2, 3, 5, 8, 12, 18, 27];
/** A recovery of a tenth within a month (from memory of published ones) stands for one that is not established yet. */
const ASSUMED = { q: 0.1, timescaleDays: 30 };
/** A schedule does nearly as well as another while its widths are at most so much wider. */
const NEARLY = 1.25;
const SECONDS_PER_DAY = 86_400;

export function planForRecovery(watch: PulsarWatch, event: PulsarEvent, asOfMjd: number): RecoveryPlan | null {
  if (event.deltaNuHz === null) return null;
  const [term] = [...event.recovery.terms].sort((a, b) => b.fraction - a.fraction);
  const q = term?.fraction ?? ASSUMED.q;
  const timescaleDays = term?.timescaleDays ?? ASSUMED.timescaleDays;
  const epochDays = event.epochMjd - mjdNumber(watch.line.epoch);
  const model = { epochDays, timescaleDays, rate: event.deltaNuHz * SECONDS_PER_DAY, q };
  const first = nextUsualTime(watch, asOfMjd);
  const widthsWith = (days: readonly number[]) =>
    expectedWidths(
      watch,
      model,
      days.map((day) => first + Math.round(day) * SIDEREAL_DAY - mjdNumber(watch.line.epoch)),
    );
  const planned = [
    ...REGULAR_DAYS.map((every) => ({
      name: every === 1 ? 'daily' : `every ${every} days`,
      days: Array.from({ length: Math.floor((DAYS_AHEAD - 1) / every) + 1 }, (_, k) => k * every),
    })),
    { name: 'front-loaded', days: FRONT_LOADED_DAYS },
  ].map((p) => ({ ...p, nights: p.days.length, widths: widthsWith(p.days) }));
  const recommended = cheapest(planned);
  return {
    event: event.id,
    q,
    timescaleDays,
    assumed: term === undefined,
    now: widthsWith([]),
    schedules: planned.map(({ name, nights, widths }) => ({ name, nights, widths })),
    recommended: recommended.name,
    nights: recommended.days.map((day, k) => ({
      mjd: first + day * SIDEREAL_DAY,
      widths: widthsWith(recommended.days.slice(0, k + 1)),
    })),
  };
}

function cheapest<Planned extends Schedule>(planned: readonly Planned[]): Planned {
  const quality = ({ widths }: Schedule) =>
    Math.sqrt((widths.q ?? Number.MAX_VALUE ** 0.5) * (widths.timescaleDays ?? Number.MAX_VALUE ** 0.5));
  const best = Math.min(...planned.map(quality));
  return planned
    .filter((p) => quality(p) <= NEARLY * best)
    .reduce((a, b) => (b.nights < a.nights || (b.nights === a.nights && quality(b) < quality(a)) ? b : a));
}

interface GlitchModel {
  readonly epochDays: number;
  readonly timescaleDays: number;
  /** Δν in turns/day, the decaying part included. */
  readonly rate: number;
  readonly q: number;
}

const PARAMETERS = 4;

/** Derivatives of the turns gained by persistent rate, its derivative (turns/day²), decaying rate and timescale. */
export function derivatives({ epochDays, timescaleDays, rate, q }: GlitchModel, tDays: number): number[] {
  const x = tDays - epochDays;
  if (x <= 0) return [0, 0, 0, 0];
  const lost = -Math.expm1(-x / timescaleDays);
  return [x, 0.5 * x * x, timescaleDays * lost, q * rate * (lost - (x / timescaleDays) * Math.exp(-x / timescaleDays))];
}

function expectedWidths(watch: PulsarWatch, model: GlitchModel, plannedDays: readonly number[]): ExpectedWidths {
  const past = asArrivals(watch);
  const usual = { ...past.at(-1)!, sigmaTurns: median(past.map((a) => a.sigmaTurns)) };
  const arrivals: CountedArrival[] = [...past, ...plannedDays.map((tDays) => ({ ...usual, tDays }))];
  const layout = nuisanceLayout(arrivals);
  const filter = createWhiteningFilter([1, 1e-3, 1e-6, ...new Array<number>(layout.size - 3).fill(0.3)], PARAMETERS);
  const row = new Float64Array(layout.size);
  const information = new Float64Array(PARAMETERS ** 2);
  arrivals.forEach((arrival, i) => {
    predict(filter, i === 0 ? 0 : arrival.tDays - arrivals[i - 1]!.tDays, watch.noise);
    writeSensitivity(layout, arrival, row);
    expectArrival(filter, row);
    absorbArrival(filter, derivatives(model, arrival.tDays), arrivalVariance(arrival.sigmaTurns, watch.noise));
    const { innovations, innovationVariance } = filter;
    for (let a = 0; a < PARAMETERS; a++)
      for (let b = 0; b < PARAMETERS; b++)
        information[PARAMETERS * a + b]! += (innovations[a]! * innovations[b]!) / innovationVariance;
  });
  return widthsOf(information, model);
}

/** Δν is the sum of both parts, Q the share of the decaying one: their σ by linear propagation. */
function widthsOf(information: Float64Array, { rate, q }: GlitchModel): ExpectedWidths {
  // In units of each parameter's own σ, so that the factor's tolerance means the same for all.
  const scale = Array.from({ length: PARAMETERS }, (_, a) => Math.sqrt(information[(PARAMETERS + 1) * a]!) || 1);
  for (let a = 0; a < PARAMETERS; a++)
    for (let b = 0; b < PARAMETERS; b++) information[PARAMETERS * a + b]! /= scale[a]! * scale[b]!;
  const determined = choleskyFactor(information, PARAMETERS, 1e-10) === PARAMETERS;
  const sigma = (weights: readonly number[]): number | null => {
    if (!determined) return null;
    const work = Float64Array.from(weights, (w, a) => w / scale[a]!);
    solveLower(information, PARAMETERS, work);
    return Math.sqrt(work.reduce((sum, w) => sum + w * w, 0));
  };
  const times = (value: number | null, factor: number) => (value === null ? null : value * factor);
  return {
    deltaNuHz: times(sigma([1, 0, 1, 0]), 1 / SECONDS_PER_DAY),
    deltaNuDotHzPerS: times(sigma([0, 1, 0, 0]), 1 / SECONDS_PER_DAY ** 2),
    q: times(sigma([-q, 0, 1 - q, 0]), 1 / Math.abs(rate)),
    timescaleDays: sigma([0, 0, 0, 1]),
  };
}
