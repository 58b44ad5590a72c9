/**
 * When to observe a pulsar next, and what that would settle. Everything is expected, not simulated: the hypotheses of today are
 * carried ahead and the information of arrivals that have not come yet is added up. Times are days MJD (TDB at the
 * barycentre, within ten minutes of the site's UTC).
 */

import { type DetectionLimit, limitAtCadence } from '../limits/detectionLimit.ts';
import type { PulsarEvent } from '../steps/pulsarEvent.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { mjdNumber } from '../time/mjd.ts';
import { type AliasPlan, planForAliases } from './aliasPlan.ts';
import { type CountSafety, countSafety } from './countSafety.ts';
import { planForRecovery, type RecoveryPlan } from './recoveryPlan.ts';
import { planForSuspicion, type SuspicionPlan } from './suspicionPlan.ts';

/** What observations would settle about a pulsar's events. */
export interface EventPlan {
  readonly pulsar: string;
  readonly asOfMjd: number;
  readonly lastArrivalMjd: number | null;
  readonly locked: boolean;
  /** Null before there is anything to predict from. */
  readonly count: CountSafety | null;
  /** For the latest event whose size is not settled. */
  readonly aliases: AliasPlan | null;
  /** For an event that is suspected. */
  readonly suspicion: SuspicionPlan | null;
  /** For the latest glitch of the last year. */
  readonly recovery: RecoveryPlan | null;
}

export interface Plan extends EventPlan {
  /** What silence would be worth at other cadences. */
  readonly cadences: readonly CadenceLimit[];
}

export interface CadenceLimit extends Omit<DetectionLimit, 'curve'> {
  readonly everyDays: number;
  /** What is confirmed within a month: at any cadence the same time to wait. Null: nothing. */
  readonly deltaNuOverNu90WithinMonth: number | null;
}

const MONTH_DAYS = 30.5;
const CADENCES_DAYS = [1, 3, 7, 14, 30];
/** A recovery is followed for so long. */
const RECOVERY_DAYS = 365;

/** @param events this pulsar's, as published, with reviewers' verdicts. */
export function planFor(watch: PulsarWatch, events: readonly PulsarEvent[], nowMjd: number): Plan {
  return { ...eventPlan(watch, events, nowMjd), cadences: watch.locked ? CADENCES_DAYS.map(limitEvery) : [] };

  function limitEvery(everyDays: number): CadenceLimit {
    const { curve, ...limit } = limitAtCadence(watch, everyDays);
    const soon = curve.findLast(({ delayDays }) => delayDays <= MONTH_DAYS);
    return { everyDays, ...limit, deltaNuOverNu90WithinMonth: soon?.deltaNuOverNu90 ?? null };
  }
}

/** As of the last arrival, for the record; null: no event leaves anything to settle. */
export function openPlan(watch: PulsarWatch, events: readonly PulsarEvent[]): EventPlan | null {
  const plan = eventPlan(watch, events, Number.NEGATIVE_INFINITY);
  return plan.aliases === null && plan.suspicion === null && plan.recovery === null ? null : plan;
}

function eventPlan(watch: PulsarWatch, events: readonly PulsarEvent[], nowMjd: number): EventPlan {
  const last = watch.line.seen.at(-1);
  const lastArrivalMjd = last === undefined ? null : mjdNumber(last.arrival.tdb);
  const asOfMjd = Math.max(nowMjd, lastArrivalMjd ?? nowMjd);
  const standing = events.filter(({ state }) => state !== 'withdrawn' && state !== 'rejected');
  const latest = (wanted: (event: PulsarEvent) => boolean) => standing.filter(wanted).at(-1) ?? null;
  const open = latest(({ aliases }) => aliases.length > 1);
  const suspected = latest(({ state }) => state === 'suspected');
  const glitch = latest(
    (e) => e.explanation === 'glitch' && e.confirmedAtMjd !== null && asOfMjd - e.epochMjd < RECOVERY_DAYS,
  );
  const ready = watch.bank !== null;
  return {
    pulsar: watch.model.name,
    asOfMjd,
    lastArrivalMjd,
    locked: watch.locked,
    count: ready ? countSafety(watch) : null,
    aliases: ready && open !== null ? planForAliases(watch, open, asOfMjd) : null,
    suspicion: ready && suspected !== null ? planForSuspicion(watch, suspected, asOfMjd) : null,
    recovery: ready && glitch !== null ? planForRecovery(watch, glitch, asOfMjd) : null,
  };
}
