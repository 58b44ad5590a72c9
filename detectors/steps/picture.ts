/** What a plot of an event shows: deviations against the spin-down before it, the fit, and ν and ν̇ from short local fits. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { fitPolynomial, type PolynomialFit } from '../math/polynomialFit.ts';
import { mjdNumber } from '../time/mjd.ts';
import type { Measurement } from './measure.ts';
import type { EventPicture, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

const BEFORE = 40;
const AFTER = 60;
const CURVE_POINTS = 240;
/** Arrivals in one local fit, of a line for ν and of a parabola for ν̇, and how far its window moves on. */
const LOCAL = { line: 5, parabola: 9 } as const;
const STEP = { line: 2, parabola: 3 } as const;
const KINK_DAYS = 1e-4;
const SECONDS_PER_DAY = 86_400;

interface Point {
  readonly index: number;
  readonly tDays: number;
  readonly deviation: number;
  readonly sigma: number;
  readonly added: number;
  readonly used: boolean;
}

export function pictureOf(
  watch: PulsarWatch,
  event: PulsarEvent,
  gapIndex: number,
  measured: Measurement,
): EventPicture | null {
  const points = pointsAround(watch, gapIndex, measured);
  const used = points.filter((p) => p.used);
  if (used.length < 4) return null;
  const zero = mjdNumber(watch.line.epoch);
  // The spin-down before the event, from all points once the event is taken off: steadier than from those before alone.
  const base = fitPolynomial(
    used.map((p) => p.tDays),
    used.map((p) => p.deviation - p.added),
    used.map((p) => p.sigma),
    2,
  );
  const [first, last] = [points[0]!.tDays, points.at(-1)!.tDays];
  const grid = curveDays(points, first, last, measured.epochDays.median);
  const at = { frequencyMhz: watch.line.firstBandMhz ?? Number.POSITIVE_INFINITY, group: used.at(-1)!.index };
  const group = watch.line.seen[at.group]!.group;
  return {
    points: points.map((p) => ({
      key: watch.line.seen[p.index]!.arrival.key,
      mjd: zero + p.tDays,
      deviationTurns: p.deviation - base.valueAt(p.tDays),
      uncertaintyTurns: p.sigma,
      used: p.used,
    })),
    fit: grid.map((t) => ({
      mjd: zero + t,
      deviationTurns: measured.curve({ tDays: t, frequencyMhz: at.frequencyMhz, group }),
    })),
    frequencyTrack: localFits(used, base.valueAt, measured.epochDays.median, 'line').map(({ tDays, fit }) => ({
      mjd: zero + tDays,
      deltaNuHz: -fit.slope / SECONDS_PER_DAY,
      uncertaintyHz: fit.slopeSigma / SECONDS_PER_DAY,
    })),
    frequencyFit: grid.map((t) => ({ mjd: zero + t, deltaNuHz: measured.frequencyCurve(t) })),
    spinDownTrack: localFits(used, base.valueAt, measured.epochDays.median, 'parabola').map(({ tDays, fit }) => ({
      mjd: zero + tDays,
      deltaNuDot: -fit.curvature / SECONDS_PER_DAY ** 2,
      uncertainty: fit.curvatureSigma / SECONDS_PER_DAY ** 2,
    })),
    spinDownFit: grid.map((t) => ({ mjd: zero + t, deltaNuDot: spinDownAdded(measured, t) })),
    epochMjd: event.epochMjd,
    epochInterval68: event.epochInterval68,
    frequencyHz: watch.model.spin.frequencyHz.hi,
  };
}

/** Evenly spaced, with every arrival and both sides of the epoch among them: a kink must not be cut by interpolation. */
function curveDays(points: readonly Point[], first: number, last: number, epoch: number): number[] {
  const even = Array.from({ length: CURVE_POINTS }, (_, i) => first + ((last - first) * i) / (CURVE_POINTS - 1));
  const own = points.map((p) => p.tDays);
  const kink = [epoch - KINK_DAYS, epoch + KINK_DAYS].filter((t) => t > first && t < last);
  return [...new Set([...even, ...own, ...kink])].sort((a, b) => a - b);
}

function pointsAround(watch: PulsarWatch, gapIndex: number, measured: Measurement): Point[] {
  const points: Point[] = [];
  const end = Math.min(measured.first + measured.arrivals.length, gapIndex + AFTER);
  for (let index = Math.max(measured.first, gapIndex - BEFORE); index < end; index++) {
    const arrival = measured.arrivals[index - measured.first]!;
    points.push({
      index,
      tDays: arrival.tDays,
      deviation: arrival.deviationTurns,
      sigma: Math.sqrt(arrivalVariance(arrival.sigmaTurns, watch.noise)),
      added: measured.curve(arrival),
      used: arrival.used,
    });
  }
  return points;
}

interface LocalFit {
  readonly tDays: number;
  readonly fit: PolynomialFit;
}

/** Fits to a few arrivals at a time, never across the event, after the spin-down before it. */
function localFits(
  used: readonly Point[],
  base: (tDays: number) => number,
  epochDays: number,
  shape: keyof typeof LOCAL,
): LocalFit[] {
  const fits: LocalFit[] = [];
  for (const side of [used.filter((p) => p.tDays < epochDays), used.filter((p) => p.tDays >= epochDays)])
    for (let i = 0; i + LOCAL[shape] <= side.length; i += STEP[shape]) {
      const local = side.slice(i, i + LOCAL[shape]);
      const t = local.map((p) => p.tDays);
      const fit = fitPolynomial(
        t,
        local.map((p) => p.deviation - base(p.tDays)),
        local.map((p) => p.sigma),
        shape === 'line' ? 1 : 2,
      );
      const sigma = shape === 'line' ? fit.slopeSigma : fit.curvatureSigma;
      if (!Number.isFinite(sigma) || sigma === 0) continue;
      fits.push({ tDays: t.reduce((a, b) => a + b, 0) / t.length, fit });
    }
  return fits;
}

/** What the event adds to ν̇, Hz/s: the slope of what it adds to ν, taken away from the epoch so as never to cross the step. */
function spinDownAdded({ frequencyCurve, epochDays }: Measurement, tDays: number): number {
  const aside = tDays < epochDays.median ? -KINK_DAYS / 2 : KINK_DAYS / 2;
  return (frequencyCurve(tDays + aside) - frequencyCurve(tDays)) / (aside * SECONDS_PER_DAY);
}
