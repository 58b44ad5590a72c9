import { createHash } from 'node:crypto';
import { type MorningReview, voevent } from '../../alerts/index.ts';
import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { Clock } from '../clock.ts';
import type { Configuration } from '../config/configuration.ts';
import type { EventRecord } from '../records.ts';
import { citedRevision } from '../stages/told.ts';
import type { PulsarReportRow, Store } from '../store/index.ts';
import type {
  ChangeMarks,
  Decision,
  FeedOverview,
  OutboxLine,
  PulsarOverview,
  PulsarState,
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
const HOUR_MS = 3_600_000;
const DAY_MS = 24 * HOUR_MS;

export function createStoreDesk(parts: StoreDeskParts): ReviewDesk {
  const { configuration, store, clock } = parts;
  const marks = () => marksOf(store, clock, parts.health());
  const version = () => digest(marks());
  const morning = keptWhileSame(parts.morning, version, clock);
  return {
    version,
    marks,
    events: () => store.events(),
    decisions: (most) => decisions(store, most),
    event: (id) => store.event(id),
    origins: ({ picture }) => store.origins(picture?.points.map(({ key }) => key) ?? []),
    plan: ({ event }) => (event.site === null ? (store.pulsarReport(event.pulsar)?.plan ?? null) : null),
    notice(id, issuedAt) {
      const record = store.event(id);
      return record === null ? null : noticeOf(store, record, configuration, issuedAt);
    },
    morning,
    pulsars: () => pulsars(configuration, store),
    feeds: () => feeds(configuration, store, morning(), clock.now()),
    files: (most) => store.recentFiles(most),
    quarantine: (most) => store.recentQuarantine(most),
    outbox: (most) => outbox(store, most),
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

/** What moves when something new is on record: files, mail, events of the last day, the watch's own health. */
function marksOf(store: Store, clock: Clock, health: WatchHealth): ChangeMarks {
  const since = new Date(clock.now().getTime() - DAY_MS).toISOString();
  return {
    events: digest(store.events({ since }).map(({ event, revision, changedAt }) => [event.id, revision, changedAt])),
    files: digest([...store.lastFileByFeed()]),
    mail: digest(store.outboxCounts()),
    health: digest(health),
  };
}

function digest(value: unknown): string {
  return createHash('sha256').update(JSON.stringify(value)).digest('hex').slice(0, 16);
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

function outbox(store: Store, most: number): OutboxLine[] {
  const rows = store.outbox().slice(-most).reverse();
  const tries = store.mailAttempts(rows.map(({ id }) => id));
  return rows.map((row) => ({ ...row, tries: tries.get(row.id) ?? [] }));
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
  const open = openEvents(store);
  return [...configuration.models.values()]
    .sort((a, b) => (a.name < b.name ? -1 : 1))
    .map(({ name: pulsar, spin }) => {
      const report = reports.get(pulsar);
      const event = open.get(pulsar) ?? null;
      return {
        pulsar,
        lastArrivalMjd: report?.lastArrivalMjd ?? null,
        locked: report?.locked ?? false,
        deltaNuOverNu90: report?.limit?.deltaNuOverNu90 ?? null,
        delayDays90: report?.limit?.delayDays90 ?? null,
        limitReason: report?.limit?.reason ?? null,
        state: stateOf(report, event),
        eventId: event?.id ?? null,
        arrivals: report?.arrivals ?? null,
        noise: report?.noise ?? null,
        frequencyHz: spin.frequencyHz.hi,
        recent: report?.recent ?? null,
      };
    });
}

/** Of each pulsar the event that most needs a person: a confirmed one before a suspected one, the later before the earlier. */
function openEvents(store: Store): Map<string, PulsarEvent> {
  const open = new Map<string, PulsarEvent>();
  for (const state of ['suspected', 'confirmed'] as const) {
    for (const { event } of store.events({ state })) for (const pulsar of event.pulsars) open.set(pulsar, event);
  }
  return open;
}

function stateOf(report: PulsarReportRow | undefined, event: PulsarEvent | null): PulsarState {
  if (event !== null) return event.state === 'confirmed' ? 'candidate' : 'suspected';
  if (report === undefined || report.lastArrivalMjd === null) return 'nothing yet';
  return report.locked ? 'watched' : 'count open';
}

function feeds(configuration: Configuration, store: Store, morning: MorningReview, now: Date): FeedOverview[] {
  const last = store.lastFileByFeed();
  const silent = new Set(morning.silentFeeds.map(({ feed }) => feed));
  const hoursSince = (at: string | undefined) => (at === undefined ? null : (now.getTime() - Date.parse(at)) / HOUR_MS);
  return configuration.feeds.map(({ name, expectEveryHours }) => ({
    feed: name,
    lastFileAt: last.get(name) ?? null,
    hoursSince: hoursSince(last.get(name)),
    expectEveryHours,
    silent: silent.has(name),
  }));
}
