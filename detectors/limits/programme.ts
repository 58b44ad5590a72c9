/**
 * The arrivals that a limit is made for: those a pulsar had of late, and then the same again, as if it went on being
 * observed as it was. Only when, how well and by what it was observed counts; what was measured does not.
 */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { median } from '../math/median.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';

export interface Programme {
  readonly arrivals: readonly CountedArrival[];
  /** Index of the first arrival that has not come yet: the step is taken to fall in the gap before it. */
  readonly firstAhead: number;
  /** How many arrivals each one of the past stands for: of long records only the last are gone through. */
  readonly pastWeight: number;
}

/** So many of the last arrivals stand for all of the past, and so many gaps for the cadence. */
const PAST_ARRIVALS = 120;
const CADENCE_GAPS = 100;
const CADENCE_DAYS = 730;

/** Arrivals ahead are at most `most`, and end after `days` but for the first `least`. */
export interface Horizon {
  readonly days: number;
  readonly least: number;
  readonly most: number;
}

/** The pulsar observed as it was. */
export function asBefore(watch: PulsarWatch, horizon: Horizon): Programme {
  const past = asArrivals(watch);
  const last = past.at(-1)!;
  const recent = past.filter((a, i) => i > past.length - 1 - CADENCE_GAPS && last.tDays - a.tDays < CADENCE_DAYS);
  const gaps = recent.slice(1).map((arrival, i) => ({ arrival, days: arrival.tDays - recent[i]!.tDays }));
  const begin = usualGap(gaps.map(({ days }) => days));
  return extended(watch, past, horizon, (i) => gaps[(begin + i) % gaps.length]!);
}

/** The pulsar observed every `everyDays`, as well as it usually is. */
export function atCadence(watch: PulsarWatch, horizon: Horizon, everyDays: number): Programme {
  const past = asArrivals(watch);
  const sigmaTurns = median(past.map((a) => a.sigmaTurns));
  const arrival = { ...past.at(-1)!, sigmaTurns };
  return extended(watch, past, horizon, () => ({ arrival, days: everyDays }));
}

/** The last arrivals that there are: when, how well and by what, not what was measured. */
export function asArrivals({ line }: PulsarWatch): CountedArrival[] {
  return line.seen.slice(-PAST_ARRIVALS).map(({ tDays, sigmaTurns, group, arrival }) => ({
    tDays,
    deviationTurns: 0,
    sigmaTurns,
    frequencyMhz: arrival.frequencyMhz,
    group,
    used: true,
  }));
}

/** The gap in which half of the observed time lies in shorter ones: where a step at a random time typically falls. */
function usualGap(gapsDays: readonly number[]): number {
  const order = gapsDays.map((_, i) => i).sort((a, b) => gapsDays[a]! - gapsDays[b]! || a - b);
  const half = gapsDays.reduce((sum, days) => sum + days, 0) / 2;
  let passed = 0;
  for (const i of order) {
    passed += gapsDays[i]!;
    if (passed >= half) return i;
  }
  return 0;
}

function extended(
  watch: PulsarWatch,
  past: readonly CountedArrival[],
  horizon: Horizon,
  ahead: (i: number) => { readonly arrival: CountedArrival; readonly days: number },
): Programme {
  const arrivals = [...past];
  const begin = past.at(-1)!.tDays;
  let tDays = begin;
  for (let i = 0; i < horizon.most; i++) {
    const { arrival, days } = ahead(i);
    tDays += days;
    if (i >= horizon.least && tDays - begin > horizon.days) break;
    arrivals.push({ ...arrival, tDays });
  }
  return { arrivals, firstAhead: past.length, pastWeight: watch.line.seen.length / past.length };
}
