import type { MorningReview, QuarantinedRow } from '../../alerts/morningReview.ts';
import type { EventPlan } from '../../detectors/index.ts';
import type { NoiseModel, RecentArrivals } from '../../detectors/report.ts';
import type {
  ArrivalOrigin,
  EventRecord,
  FileRecord,
  ListedEvent,
  MailAttempt,
  OutboxRecord,
  VerdictRecord,
} from '../records.ts';

/**
 * Everything the review page may ask of the daemon, and the one thing it may change: a verdict.
 * Calls are synchronous and short; whoever implements them reads stored results and computes nothing heavy.
 * Times are ISO 8601 UTC.
 */
export interface ReviewDesk {
  /** Differs whenever anything shown on a page has changed; the page polls it. */
  version(): string;
  /** The same by subject, so that a page can say what changed. */
  marks(): ChangeMarks;
  /** Every event on record, oldest first. */
  events(): readonly ListedEvent[];
  /** Accepted, rejected or withdrawn, the latest first. */
  decisions(most: number): readonly Decision[];
  /** By its id or one it had before; null: no event has this id. */
  event(id: string): EventRecord | null;
  /** Where the arrivals of an event's picture came from, in time order. */
  origins(record: EventRecord): readonly ArrivalOrigin[];
  /** As of its pulsar's last arrival: what more of them would settle about its events; null: nothing is open. */
  plan(record: EventRecord): EventPlan | null;
  /** The event as a notice for others, VOEvent 2.0 XML; null: no event has this id. */
  notice(id: string, issuedAt: Date): string | null;
  morning(): MorningReview;
  pulsars(): readonly PulsarOverview[];
  feeds(): readonly FeedOverview[];
  /** Newest first. */
  files(most: number): readonly FileRecord[];
  /** Newest first. */
  quarantine(most: number): readonly QuarantinedRow[];
  /** Newest first. */
  outbox(most: number): readonly OutboxLine[];
  health(): WatchHealth;
  /** What the page Health shows beside the problems. */
  vitalSigns(): VitalSigns;
  /** For a monitoring system: OpenMetrics text. */
  metrics(): string;
  /** One transaction; nothing is recorded unless the event still stands at `expectedRevision`. */
  recordVerdict(order: VerdictOrder): VerdictOutcome;
}

export interface OutboxLine extends OutboxRecord {
  /** Oldest first; of those from before they were kept, none. */
  readonly tries: readonly MailAttempt[];
}

/** Each differs whenever its subject has changed. */
export interface ChangeMarks {
  readonly events: string;
  readonly files: string;
  readonly mail: string;
  readonly health: string;
}

export interface Decision {
  readonly event: ListedEvent['event'];
  readonly at: string;
  /** Null: the detector withdrew it by itself. */
  readonly verdict: VerdictRecord | null;
}

/** What the watch can say of one pulsar, and above all how small a glitch its silence rules out. */
export interface PulsarOverview {
  readonly pulsar: string;
  readonly lastArrivalMjd: number | null;
  /** False until one pulse count has won; alerts are held until then. */
  readonly locked: boolean;
  /** Smallest Δν/ν confirmed with 90 % probability, and the days it would take; null until known. */
  readonly deltaNuOverNu90: number | null;
  readonly delayDays90: number | null;
  /** Why there is no limit; null where there is one. */
  readonly limitReason: string | null;
  readonly state: PulsarState;
  /** What the state is about, to open. */
  readonly eventId: string | null;
  readonly arrivals: number | null;
  readonly noise: NoiseModel | null;
  /** ν of the pulsar's model, Hz. */
  readonly frequencyHz: number;
  readonly recent: RecentArrivals | null;
}

/** The most urgent that holds. */
export const PULSAR_STATES = ['candidate', 'suspected', 'count open', 'watched', 'nothing yet'] as const;
export type PulsarState = (typeof PULSAR_STATES)[number];

export interface FeedOverview {
  readonly feed: string;
  readonly lastFileAt: string | null;
  readonly hoursSince: number | null;
  /** Null: silence of this feed is never reported. */
  readonly expectEveryHours: number | null;
  readonly silent: boolean;
}

export interface WatchHealth {
  readonly ok: boolean;
  /** For a person, without paths or secrets. Empty when ok. */
  readonly problems: readonly string[];
}

/** How the watch stands in numbers. */
export interface VitalSigns {
  readonly versions: { readonly program: string; readonly node: string; readonly sqlite: string };
  readonly startedAt: string;
  readonly recordBytes: number;
  readonly residentBytes: number;
  readonly stages: readonly StageSign[];
  readonly tables: readonly TableSign[];
  readonly heartbeats: readonly HeartbeatSign[];
}

/** A part of the daemon that must go on making progress. */
export interface StageSign {
  readonly name: string;
  /** Nothing is in hand, so that none is expected. */
  readonly resting: boolean;
  readonly secondsSinceProgress: number;
  readonly limitSeconds: number;
  readonly late: boolean;
}

export interface TableSign {
  readonly name: string;
  /** Null: it does not end. */
  readonly endsMjd: number | null;
  readonly state: 'good' | 'ends soon' | 'ended';
}

export interface HeartbeatSign {
  /** Without the address: it may be a secret. */
  readonly way: 'web' | 'mail';
  readonly lastSentAt: string | null;
  /** Why the last one was held back or did not arrive; null: it did. */
  readonly trouble: string | null;
}

export interface VerdictOrder {
  readonly eventId: string;
  readonly expectedRevision: number;
  readonly verdict: VerdictRecord['verdict'];
  readonly by: string;
  readonly note: string;
  readonly at: string;
}

/** The same order twice is `ok` twice and recorded once. `conflict`: nothing was recorded; the message says why. */
export type VerdictOutcome =
  | { readonly kind: 'ok' }
  | { readonly kind: 'unknown' }
  | { readonly kind: 'conflict'; readonly message: string };
