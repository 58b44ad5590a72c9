import { createHash } from 'node:crypto';
import { type MorningReview, voevent } from '../../alerts/index.ts';
import type { Clock } from '../clock.ts';
import type { Configuration } from '../config/configuration.ts';
import type { EventRecord } from '../records.ts';
import { citedRevision } from '../stages/told.ts';
import type { Store } from '../store/index.ts';
import type {
  Decision,
  FeedOverview,
  PulsarOverview,
  ReviewDesk,
  VerdictOutcome,
  VitalSigns,
  WatchHealth,
} from './desk.ts';

/** The desk over the record. It reads what is stored; the one thing it writes is a verdict. */
export interface StoreDeskParts {
  readonly configuration: Configuration;
  readonly store: Store;
  readonly clock: Clock;
  readonly morning: () => MorningReview;
  readonly health: () => WatchHealth;
  readonly vitalSigns: () => VitalSigns;
  readonly metrics: () => string;
}

/** Silence grows without anything being written: the morning is made anew after this time at the latest. */
const MORNING_KEPT_MS = 60_000;
const DAY_MS = 86_400_000;

export function createStoreDesk(parts: StoreDeskParts): ReviewDesk {
  const { configuration, store, clock } = parts;
  const version = () => versionOf(store, clock, parts.health());
  const morning = keptWhileSame(parts.morning, version, clock);
  return {
    version,
    events: () => store.events(),
    decisions: (most) => decisions(store, most),
    event: (id) => store.event(id),
    notice(id, issuedAt) {
      const record = store.event(id);
      return record === null ? null : noticeOf(store, record, configuration, issuedAt);
    },
    morning,
    pulsars: () => pulsars(configuration, store),
    feeds: () => feeds(configuration, store, morning()),
    files: (most) => store.recentFiles(most),
    quarantine: (most) => store.recentQuarantine(most),
    outbox: (most) => store.outbox().slice(-most).reverse(),
    health: parts.health,
    vitalSigns: parts.vitalSigns,
    metrics: parts.metrics,
    recordVerdict({ eventId, ...order }): VerdictOutcome {
      const outcome = store.recordVerdict(eventId, order);
      if (outcome.kind === 'unknown event') return { kind: 'unknown' };
      return outcome.kind === 'conflict' ? { kind: 'conflict', message: outcome.message } : { kind: 'ok' };
    },
  };
}

/** A digest of what moves when something new is on record: files, mail, events of the last day, the watch's own health. */
function versionOf(store: Store, clock: Clock, health: WatchHealth): string {
  const since = new Date(clock.now().getTime() - DAY_MS).toISOString();
  const moved = [
    [...store.lastFileByFeed()],
    store.outboxCounts(),
    store.events({ since }).map(({ event, revision, changedAt }) => [event.id, revision, changedAt]),
    health,
  ];
  return createHash('sha256').update(JSON.stringify(moved)).digest('hex').slice(0, 16);
}

/** The morning review reads much; several pages and reloads share one. */
function keptWhileSame(make: () => MorningReview, version: () => string, clock: Clock): () => MorningReview {
  let kept: { readonly review: MorningReview; readonly version: string; readonly madeMs: number } | null = null;
  return () => {
    const now = { version: version(), madeMs: clock.monotonicMs() };
    if (kept === null || kept.version !== now.version || now.madeMs - kept.madeMs > MORNING_KEPT_MS) {
      kept = { review: make(), ...now };
    }
    return kept.review;
  };
}

function decisions(store: Store, most: number): Decision[] {
  return store
    .events()
    .filter(({ event }) => event.state === 'accepted' || event.state === 'rejected' || event.state === 'withdrawn')
    .sort((a, b) => (a.changedAt < b.changedAt ? 1 : -1))
    .slice(0, most)
    .map(({ event, changedAt }) => {
      const verdict = event.state === 'withdrawn' ? null : (store.event(event.id)?.verdicts.at(-1) ?? null);
      return { event, at: verdict?.at ?? changedAt, verdict };
    });
}

function noticeOf(
  store: Store,
  { event, revision }: EventRecord,
  configuration: Configuration,
  issuedAt: Date,
): string {
  const model = event.site === null ? (configuration.models.get(event.pulsar) ?? null) : null;
  return voevent(event, {
    observatory: configuration.observatory,
    model,
    revision,
    issuedAt,
    cites: citedRevision({ store }, event.id, revision),
    drill: false,
  });
}

/** Every configured pulsar, also one of which nothing has come in yet. */
function pulsars(configuration: Configuration, store: Store): PulsarOverview[] {
  const reports = new Map(store.pulsarReports().map((report) => [report.pulsar, report]));
  return [...configuration.models.keys()].sort().map((pulsar) => {
    const report = reports.get(pulsar);
    return {
      pulsar,
      lastArrivalMjd: report?.lastArrivalMjd ?? null,
      locked: report?.locked ?? false,
      deltaNuOverNu90: report?.limit?.deltaNuOverNu90 ?? null,
      delayDays90: report?.limit?.delayDays90 ?? null,
    };
  });
}

function feeds(configuration: Configuration, store: Store, morning: MorningReview): FeedOverview[] {
  const last = store.lastFileByFeed();
  const silent = new Set(morning.silentFeeds.map(({ feed }) => feed));
  return configuration.feeds.map(({ name, expectEveryHours }) => ({
    feed: name,
    lastFileAt: last.get(name) ?? null,
    expectEveryHours,
    silent: silent.has(name),
  }));
}
