/** From a track and its measurement to the event on record. */

import { falseAlertsPerYearAt } from '../nulls/ownNull.ts';
import { mjdNumber } from '../time/mjd.ts';
import { RATE_PER_YEAR } from './births.ts';
import { NO_SIZES, sizesOf } from './eventSizes.ts';
import { explained } from './explained.ts';
import type { Measurement } from './measure.ts';
import type { Explanation, Interval, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import type { SessionShares, SessionSpan } from './sessionShares.ts';
import type { Track } from './track.ts';

const DAYS_PER_YEAR = 365.25;
const LOG_ODDS_SHOWN = 700;
const LEAST_GAP_DAYS = 1e-6;

/** Everything about an event that is not its size. */
type Outline = Pick<
  PulsarEvent,
  | 'id'
  | 'pulsar'
  | 'state'
  | 'firstArrivalMjd'
  | 'suspectedAtMjd'
  | 'confirmedAtMjd'
  | 'arrivalsUsed'
  | 'logBayesFactor'
  | 'falseAlertsPerYearAtThisLevel'
  | 'pulsars'
  | 'site'
>;

export function describe(watch: PulsarWatch, track: Track, measured: Measurement | null): PulsarEvent {
  const { seen } = watch.line;
  const mjdOf = (index: number) => mjdNumber(seen[index]!.arrival.tdb);
  // Two receivers may record one pulse at the same time.
  const gapDays = Math.max(LEAST_GAP_DAYS, seen[track.bestGap]!.tDays - seen[track.bestGap - 1]!.tDays);
  const logOdds = Math.max(-LOG_ODDS_SHOWN, Math.min(LOG_ODDS_SHOWN, track.logOdds));
  const outline: Outline = {
    id: track.id,
    pulsar: watch.model.name,
    state: track.state,
    firstArrivalMjd: mjdOf(track.bestGap),
    suspectedAtMjd: mjdOf(track.suspectedAt),
    confirmedAtMjd: track.confirmedAt === null ? null : mjdOf(track.confirmedAt),
    arrivalsUsed: measured === null ? 0 : measured.arrivals.filter((a) => a.used).length,
    logBayesFactor: logOdds - Math.log((RATE_PER_YEAR[track.kind] * gapDays) / DAYS_PER_YEAR),
    falseAlertsPerYearAtThisLevel: falseAlertsPerYearAt(watch, logOdds),
    pulsars: [watch.model.name],
    site: track.kind === 'clock step' ? seen[track.bestGap]!.arrival.site : null,
  };
  return {
    ...outline,
    ...explained(track, measured?.glitch?.deltaNuHz ?? null),
    ...epochs(watch, track, measured),
    ...sizesOf(watch, measured),
  };
}

function epochs(
  watch: PulsarWatch,
  track: Track,
  measured: Measurement | null,
): Pick<PulsarEvent, 'epochMjd' | 'epochInterval68' | 'epochInterval95'> {
  const zero = mjdNumber(watch.line.epoch);
  if (measured !== null) {
    const { median, interval68, interval95 } = measured.epochDays;
    return {
      epochMjd: zero + median,
      epochInterval68: [zero + interval68[0], zero + interval68[1]],
      epochInterval95: [zero + interval95[0], zero + interval95[1]],
    };
  }
  const low = zero + watch.line.seen[track.firstGap - 1]!.tDays;
  const high = zero + watch.line.seen[track.lastGap]!.tDays;
  return { epochMjd: (low + high) / 2, epochInterval68: [low, high], epochInterval95: [low, high] };
}

/** A session that was set aside whole while its neighbours were used. */
export function describeBadSession(
  watch: PulsarWatch,
  session: SessionSpan & { readonly confirmedAt: number },
  { explanations, logBayesFactor }: SessionShares,
): PulsarEvent {
  const { seen } = watch.line;
  const mjdOf = (index: number) => mjdNumber(seen[index]!.arrival.tdb);
  const explanation: Explanation = 'bad session';
  const interval: Interval = [mjdOf(session.first), mjdOf(session.last)];
  return {
    id: `${watch.model.name.replace(/\s+/g, '')}-${Math.floor(interval[0])}-session`,
    pulsar: watch.model.name,
    state: 'confirmed',
    explanation,
    explanations,
    epochMjd: interval[0],
    epochInterval68: interval,
    epochInterval95: interval,
    firstArrivalMjd: interval[0],
    suspectedAtMjd: interval[1],
    confirmedAtMjd: mjdOf(session.confirmedAt),
    arrivalsUsed: session.last - session.first + 1,
    logBayesFactor: Math.max(-LOG_ODDS_SHOWN, Math.min(LOG_ODDS_SHOWN, logBayesFactor)),
    falseAlertsPerYearAtThisLevel: 0,
    pulsars: [watch.model.name],
    site: seen[session.first]!.arrival.site,
    ...NO_SIZES,
  };
}
