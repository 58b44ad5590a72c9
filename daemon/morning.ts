import { median } from 'simple-statistics';
import type { MorningReview } from '../alerts/index.ts';
import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import { type Clock, civilTime, instantOf, mjdOf } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import { digestRule } from './schedule/digestDue.ts';
import { silentFeeds } from './schedule/silentFeeds.ts';
import type { Store } from './store/index.ts';

/** What the morning review is made from. It reads what is on record and decides nothing. */
export interface MorningSources {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly clock: Clock;
  /** Known to the caller alone: tables that ran out, a wall clock that stepped. */
  readonly warnings: readonly string[];
}

const DAY_MS = 86_400_000;
const HOUR_MS = 3_600_000;

/**
 * The review of a civil date in the observatory's zone (absent: of today). It covers what came in since the digest before; for a
 * date gone by, up to that day's own digest. Events stand in it as they are now.
 */
export function morningReview(sources: MorningSources, date?: string): MorningReview {
  const { configuration, store, clock } = sources;
  const now = clock.now();
  const period = date === undefined ? sinceLastDigest(sources, now) : ofDate(configuration, date, now);
  const events = store.events();
  const confirmed = events.filter(({ event }) => event.state === 'confirmed').map(({ event }) => event);
  const counts = store.outboxCounts();
  const oldest = counts.oldestWaitingSince;
  const reports = store.pulsarReports();
  return {
    observatory: configuration.observatory.name,
    ...period,
    waiting: confirmed.sort(mostCredibleFirst),
    suspected: events
      .filter(({ event }) => event.state === 'suspected')
      .map(({ event }) => event)
      .sort(mostCredibleFirst),
    changed: store.eventChangesSince(period.since).filter((change) => change.at <= period.until),
    quarantined: store.quarantinedSince(period.since).filter((row) => row.at <= period.until),
    silentFeeds: silentFeeds(configuration, store, now),
    silentPulsars: silentPulsars(store, now),
    unlockedPulsars: reports.filter((report) => !report.locked).map((report) => report.pulsar),
    intake: store.intakeSince(period.since),
    limits: [],
    mail: {
      waiting: counts.queued + counts.attempting,
      refused: counts.refused,
      oldestWaitingHours: oldest === null ? null : (now.getTime() - Date.parse(oldest)) / HOUR_MS,
    },
    warnings: [...sources.warnings, ...clockTableWarnings(configuration, now)],
  };
}

type Period = Pick<MorningReview, 'date' | 'since' | 'until'>;

function sinceLastDigest({ configuration, store }: MorningSources, now: Date): Period {
  const { date } = civilTime(now, configuration.mail.timezone);
  const since = store.lastDigest()?.at ?? new Date(now.getTime() - DAY_MS).toISOString();
  return { date, since, until: now.toISOString() };
}

function ofDate(configuration: Configuration, date: string, now: Date): Period {
  const { timezone, digestCron } = configuration.mail;
  const { time } = digestRule(digestCron, timezone);
  const dayBefore = new Date(Date.parse(`${date}T12:00:00Z`) - DAY_MS).toISOString().slice(0, 10);
  const until = instantOf({ date, time }, timezone);
  return {
    date,
    since: instantOf({ date: dayBefore, time }, timezone).toISOString(),
    until: (until < now ? until : now).toISOString(),
  };
}

function mostCredibleFirst(a: PulsarEvent, b: PulsarEvent): number {
  return b.logBayesFactor - a.logBayesFactor || a.epochMjd - b.epochMjd;
}

/** A pulsar is missed when it is silent for this many of its usual gaps, and for a week at least. */
const USUAL_GAPS = 5;
const LEAST_DAYS_MISSED = 7;
/** After half a year it is no longer observed, and nobody needs to be told every morning. */
const MOST_DAYS_MISSED = 180;
const RECENT_SESSIONS = 30;

function silentPulsars(store: Store, now: Date): MorningReview['silentPulsars'] {
  const today = mjdOf(now);
  return [...store.lastArrivalByPulsar()].flatMap(([pulsar, lastArrivalMjd]) => {
    const daysSilent = today - lastArrivalMjd;
    if (daysSilent < LEAST_DAYS_MISSED || daysSilent > MOST_DAYS_MISSED) return [];
    return daysSilent > USUAL_GAPS * usualGapDays(store, pulsar) ? [{ pulsar, lastArrivalMjd, daysSilent }] : [];
  });
}

function usualGapDays(store: Store, pulsar: string): number {
  const days = [...new Set(store.liveArrivals(pulsar).map((arrival) => arrival.time.day))].slice(-RECENT_SESSIONS);
  const gaps = days.slice(1).map((day, i) => day - days[i]!);
  return gaps.length === 0 ? Number.POSITIVE_INFINITY : median(gaps);
}

function clockTableWarnings(configuration: Configuration, now: Date): string[] {
  return configuration.sites.flatMap(({ name, clockTable }) => {
    const end = clockTable?.mjd.at(-1);
    const daysAgo = end === undefined ? 0 : mjdOf(now) - end;
    if (end === undefined || daysAgo < 1) return [];
    return [
      `the clock table of ${name} ends at MJD ${end}, ${Math.floor(daysAgo)} days ago: later arrivals are uncorrected and marked; deliver a newer table`,
    ];
  });
}
