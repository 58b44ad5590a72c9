import { median } from 'simple-statistics';
import type { MorningReview } from '../alerts/index.ts';
import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import { changesInBrief } from './changesInBrief.ts';
import { civilTime, instantOf, mjdOf } from './clock.ts';
import { falseAlertCount } from './falseAlertCount.ts';
import { recordWarnings } from './schedule/dailyChecks.ts';
import { type DigestRule, digestRule } from './schedule/digestDue.ts';
import { silentFeeds } from './schedule/silentFeeds.ts';
import { diskWarning, type TroubleSources } from './schedule/troubles.ts';
import { clockStepWarnings } from './schedule/upkeep.ts';
import { wasHeldBack } from './stages/mailVerdict.ts';
import type { Station } from './station.ts';
import type { PulsarReportRow, Store } from './store/index.ts';
import { type LoadedTables, leapSecondWarning } from './tables/loadTables.ts';
import { endedTableWarnings } from './tables/tableEnds.ts';

/** What the morning review is made from. It reads what is on record and decides nothing. */
export interface MorningSources
  extends Pick<Station, 'configuration' | 'store' | 'clock'>,
    Pick<TroubleSources, 'freeBytes'> {
  /** What the caller alone knows (`tableWarnings`). */
  readonly warnings: readonly string[];
}

const DAY_MS = 86_400_000;
const HOUR_MS = 3_600_000;

/**
 * The review of a civil date in the observatory's zone (absent: of today). It covers what came in since the digest before that date's;
 * for a date gone by, up to that date's own. Events stand in it as they are now.
 */
export function morningReview(sources: MorningSources, date?: string): MorningReview {
  const { configuration, store, clock } = sources;
  const now = clock.now();
  const period = periodOf(sources, now, date);
  const events = store.events();
  const confirmed = events.filter(({ event }) => event.state === 'confirmed').map(({ event }) => event);
  const counts = store.outboxCounts();
  const oldest = counts.oldestWaitingSince;
  const reports = store.pulsarReports();
  const silent = silentPulsars(store, now);
  const changes = store.eventChangesSince(period.since).filter((change) => change.at <= period.until);
  return {
    observatory: configuration.observatory.name,
    ...period,
    waiting: confirmed.sort(mostCredibleFirst),
    suspected: events
      .filter(({ event }) => event.state === 'suspected')
      .map(({ event }) => event)
      .sort(mostCredibleFirst),
    changed: changesInBrief(changes.filter(({ isFirst }) => !isFirst)),
    heldBack: changes.flatMap(({ event, alert, at }) => (wasHeldBack(alert) ? [{ event, why: alert ?? '', at }] : [])),
    quarantined: store.quarantinedSince(period.since).filter((row) => row.at <= period.until),
    silentFeeds: silentFeeds(configuration, store, now),
    silentPulsars: silent,
    unlockedPulsars: reports.filter((report) => !report.locked).map((report) => report.pulsar),
    intake: store.intakeSince(period.since),
    limits: limitsOf(reports, silent, mjdOf(now)),
    falseAlerts: falseAlertCount(
      events.map(({ event }) => event),
      configuration.budget.falseAlertsPerYear,
      mjdOf(now),
    ),
    mail: {
      waiting: counts.queued + counts.attempting,
      undelivered: undelivered(store, period),
      oldestWaitingHours: oldest === null ? null : Math.max(0, (now.getTime() - Date.parse(oldest)) / HOUR_MS),
    },
    warnings: [
      ...recordWarnings(sources),
      ...sources.warnings,
      ...endedTableWarnings(configuration, mjdOf(now)),
      ...clockStepWarnings(sources),
      ...[diskWarning(sources)].filter((warning) => warning !== null),
    ],
  };
}

function undelivered(store: Store, { since }: { readonly since: string }): MorningReview['mail']['undelivered'] {
  return store
    .outbox({ givenUpSince: since })
    .map(({ subject, recipient, lastError }) => ({ subject, recipient, why: lastError ?? 'not known' }));
}

/** The blindest first. Of a pulsar that is no longer observed as it was, the limit says nothing. */
function limitsOf(
  reports: readonly PulsarReportRow[],
  silent: MorningReview['silentPulsars'],
  today: number,
): MorningReview['limits'] {
  const missed = new Set(silent.map(({ pulsar }) => pulsar));
  return reports
    .flatMap(({ pulsar, lastArrivalMjd, limit }) => {
      if (!limit || limit.deltaNuOverNu90 === null || limit.delayDays90 === null) return [];
      if (missed.has(pulsar) || lastArrivalMjd === null || today - lastArrivalMjd > MOST_DAYS_MISSED) return [];
      return [{ pulsar, deltaNuOverNu90: limit.deltaNuOverNu90, delayDays90: limit.delayDays90 }];
    })
    .sort((a, b) => b.deltaNuOverNu90 - a.deltaNuOverNu90);
}

type Period = Pick<MorningReview, 'date' | 'since' | 'until'>;

function periodOf({ configuration, store }: MorningSources, now: Date, askedFor: string | undefined): Period {
  const { timezone, digestCron } = configuration.mail;
  const rule = digestRule(digestCron, timezone);
  const date = askedFor ?? civilTime(now, timezone).date;
  const before = instantOf({ date: digestDateBefore(rule, date), time: rule.time }, timezone).toISOString();
  if (askedFor === undefined) {
    // After days of downtime the digest of today covers them all.
    const [since = before] = [before, store.lastDigest()?.at ?? before].sort();
    return { date, since, until: now.toISOString() };
  }
  const own = instantOf({ date, time: rule.time }, timezone);
  return { date, since: before, until: (own < now ? own : now).toISOString() };
}

const MOST_DAYS_BACK = 40;

function digestDateBefore(rule: DigestRule, date: string): string {
  const noon = Date.parse(`${date}T12:00:00Z`);
  const back = (days: number) => new Date(noon - days * DAY_MS).toISOString().slice(0, 10);
  for (let days = 1; days < MOST_DAYS_BACK; days++) if (rule.matchesDate(back(days))) return back(days);
  return back(MOST_DAYS_BACK);
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
  const days = store.lastDays(pulsar, RECENT_SESSIONS);
  const gaps = days.slice(1).map((day, i) => day - days[i]!);
  return gaps.length === 0 ? Number.POSITIVE_INFINITY : median(gaps);
}

/** What is to be said of the tables that the way to the barycentre is read from. */
export function tableWarnings({ tables, warnings }: LoadedTables, now: Date): string[] {
  const leapSeconds = leapSecondWarning(tables.leapSeconds, mjdOf(now));
  return leapSeconds === null ? [...warnings] : [...warnings, leapSeconds];
}
