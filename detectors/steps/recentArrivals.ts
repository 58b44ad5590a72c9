import { fitPolynomial } from '../math/polynomialFit.ts';
import type { ArrivalVerdict, RecentArrivals } from '../report.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

/** What a small picture of a pulsar shows: its last arrivals, and how often it is observed. */

const MOST = 60;
const NANOTURN = 1e-9;

export function recentArrivals(watch: PulsarWatch, verdicts: readonly ArrivalVerdict[]): RecentArrivals {
  const from = Math.max(0, watch.line.seen.length - MOST);
  const seen = watch.line.seen.slice(from);
  const own = verdicts.slice(from);
  const last = seen.at(-1)?.tDays ?? 0;
  const used = own.flatMap((v, i) => (v.fate === 'used' ? [i] : []));
  const through =
    used.length <= PARABOLA
      ? { valueAt: () => 0 }
      : fitPolynomial(
          used.map((i) => seen[i]!.tDays),
          used.map((i) => own[i]!.deviationTurns),
          used.map((i) => own[i]!.uncertaintyTurns),
          2,
        );
  return {
    points: own.map((v, i) => [
      rounded(seen[i]!.tDays - last, 1e-4),
      rounded(v.deviationTurns - through.valueAt(seen[i]!.tDays), NANOTURN),
      rounded(v.uncertaintyTurns, NANOTURN),
      v.fate === 'used',
    ]),
    everyDays: medianGap(seen),
  };
}

/** A parabola through fewer points says nothing. */
const PARABOLA = 4;

/** Between the first arrivals of one session and the next; null for a single session. */
function medianGap(seen: PulsarWatch['line']['seen']): number | null {
  const starts = seen.filter((s, i) => i === 0 || s.session !== seen[i - 1]!.session).map((s) => s.tDays);
  const gaps = starts
    .slice(1)
    .map((t, i) => t - starts[i]!)
    .sort((a, b) => a - b);
  return gaps.length === 0 ? null : rounded(gaps[Math.floor(gaps.length / 2)]!, 1e-3);
}

/** Kept on record for every pulsar: no more digits than the picture can show. */
function rounded(value: number, unit: number): number {
  return Number((Math.round(value / unit) * unit).toPrecision(12));
}
