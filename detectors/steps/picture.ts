/** What a plot of an event shows: deviations against the spin-down before it, the fit, and ν from short local fits. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { fitPolynomial } from '../math/polynomialFit.ts';
import { mjdNumber } from '../time/mjd.ts';
import type { Measurement } from './measure.ts';
import type { EventPicture, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

const BEFORE = 40;
const AFTER = 60;
const CURVE_POINTS = 240;
/** Arrivals in one local fit of ν, and how far its window moves on. */
const LOCAL = 5;
const STEP = 2;
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
    frequencyTrack: frequencyTrack(used, base.valueAt, measured.epochDays.median, zero),
    frequencyFit: grid.map((t) => ({ mjd: zero + t, deltaNuHz: measured.frequencyCurve(t) })),
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

/** ν of a few arrivals at a time, never across the event, minus the spin-down before it. */
function frequencyTrack(
  used: readonly Point[],
  base: (tDays: number) => number,
  epochDays: number,
  zero: number,
): EventPicture['frequencyTrack'] {
  const track: { mjd: number; deltaNuHz: number; uncertaintyHz: number }[] = [];
  for (const side of [used.filter((p) => p.tDays < epochDays), used.filter((p) => p.tDays >= epochDays)])
    for (let i = 0; i + LOCAL <= side.length; i += STEP) {
      const local = side.slice(i, i + LOCAL);
      const t = local.map((p) => p.tDays);
      const line = fitPolynomial(
        t,
        local.map((p) => p.deviation - base(p.tDays)),
        local.map((p) => p.sigma),
        1,
      );
      if (!Number.isFinite(line.slopeSigma) || line.slopeSigma === 0) continue;
      track.push({
        mjd: zero + t.reduce((a, b) => a + b, 0) / t.length,
        deltaNuHz: -line.slope / SECONDS_PER_DAY,
        uncertaintyHz: line.slopeSigma / SECONDS_PER_DAY,
      });
    }
  return track;
}
