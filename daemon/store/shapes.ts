import type { BarycentredArrival, Quality, ReceivedArrival } from '../../detectors/arrival.ts';
import type { DetectionLimit } from '../../detectors/limits/detectionLimit.ts';
import type { EventPlan } from '../../detectors/plan/plan.ts';
import type { NoiseModel, RecentArrivals } from '../../detectors/report.ts';
import type { PulsarTimes } from '../../detectors/site/pulsarTimes.ts';
import type { SiteStep } from '../../detectors/site/siteStep.ts';
import type { EventPicture, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import type { EventRecord, FileRecord, OutboxRecord } from '../records.ts';

/** What callers hand to the store and get from it. Every time is ISO 8601 UTC and passed in: the store has no clock. */

/**
 * One change of the record, committed whole or not at all: what a file said, what it changed, and the mail that causes.
 * Without a file (`file: null`): a new decision on old arrivals, after a changed model or clock table.
 */
export interface IntakeBatch {
  readonly at: string;
  readonly file: NewFile | null;
  /** Rows not on record before. */
  readonly arrivals: readonly NewArrival[];
  /** Rows of this file that are on record already, by content. */
  readonly sightings: readonly Sighting[];
  /** Older arrivals that were revised, withdrawn, or stand again. */
  readonly statusChanges: readonly StatusChange[];
  /** Arrivals brought to the barycentre anew, with better tables. */
  readonly retimed: readonly RetimedArrival[];
  readonly quarantined: readonly QuarantinedLine[];
  readonly reports: readonly PulsarReportRow[];
  readonly events: readonly EventUpsert[];
  /** Events that nobody was told of and that the detector no longer holds. */
  readonly droppedEvents: readonly string[];
  readonly messages: readonly NewMessage[];
  /** Message-IDs still queued that newer ones replace: they will not be sent. */
  readonly supersededMessages: readonly string[];
}

/** A batch that changes nothing: spread it and fill in what there is. */
export function emptyBatch(at: string): IntakeBatch {
  return {
    at,
    file: null,
    arrivals: [],
    sightings: [],
    statusChanges: [],
    retimed: [],
    quarantined: [],
    reports: [],
    events: [],
    droppedEvents: [],
    messages: [],
    supersededMessages: [],
  };
}

export interface NewFile {
  readonly feed: string;
  readonly path: string;
  /** The name's bytes in hexadecimal, where the name is not UTF-8; the identity of the path. Absent: those of `path`. */
  readonly pathBytesHex?: string;
  readonly sha256: string;
  readonly bytes: number;
  /** What `stat` said, in the watcher's own words; equal means unchanged. */
  readonly signature: string;
  /** Rows the reader saw. The store refuses the batch unless every one is stored, same, revising or quarantined. */
  readonly rows: number;
  /** Why the whole file could not be read; its earlier revision then goes on standing. */
  readonly fault: string | null;
}

/** A path's last revision, with what tells whether it must be read again. */
export interface KnownFile extends FileRecord {
  readonly revision: number;
  readonly signature: string;
}

export interface NewArrival {
  readonly key: string;
  readonly line: number;
  readonly received: ReceivedArrival;
  /** Null with quality `unusable`. */
  readonly barycentred: BarycentredArrival | null;
  readonly quality: Quality;
  readonly qualityReasons: readonly string[];
  /** Key of the earlier arrival whose value this one replaces. */
  readonly revises: string | null;
}

export interface Sighting {
  readonly key: string;
  readonly line: number;
}

export interface StatusChange {
  readonly key: string;
  readonly status: 'live' | 'revised' | 'withdrawn';
  readonly reason: string;
}

export interface RetimedArrival {
  readonly key: string;
  readonly barycentred: BarycentredArrival | null;
  readonly quality: Quality;
  readonly qualityReasons: readonly string[];
}

export interface QuarantinedLine {
  /** Null: the whole file. */
  readonly line: number | null;
  /** As the row names it; absent or null where it names none. */
  readonly pulsar?: string | null;
  readonly reason: string;
}

/** What the detector said last about one pulsar alone, before events of several pulsars were joined. */
export interface PulsarReportRow {
  readonly pulsar: string;
  /** What it rests on (model, settings), in the caller's words: another value means that it must be decided again. */
  readonly basis: string;
  readonly events: readonly PulsarEvent[];
  readonly locked: boolean;
  readonly noise: NoiseModel;
  readonly lastArrivalMjd: number | null;
  /** What it says of the clocks of its sites; absent: as it was. Read by itself. */
  readonly times?: PulsarTimes;
  /** The steps of those clocks that `events` rest on; absent: none. */
  readonly siteSteps?: readonly SiteStep[];
  /** Absent in records of before limits were kept: `limits` works it out, and the next decision keeps it. */
  readonly limit?: DetectionLimit;
  /** Live arrivals that the report rests on; absent with the limit. */
  readonly arrivals?: number;
  /** Absent in records of before it was kept. */
  readonly recent?: RecentArrivals;
  /** What observations after the last arrival would settle about its events; absent: nothing is open. */
  readonly plan?: EventPlan;
}

export interface EventUpsert {
  /** With the detector's own state; a standing verdict goes on being shown. */
  readonly event: PulsarEvent;
  readonly picture: EventPicture | null;
  /** The event on record that this one continues under a new id. */
  readonly formerId: string | null;
  /** The revision it becomes: that on record when `change` is null, else one more (1 for a new event). */
  readonly revision: number;
  /** The line for its history; null refreshes the numbers without a new revision. */
  readonly change: string | null;
  /** In words, whether that change was mailed, and why; absent or null: not known. */
  readonly alert?: string | null;
}

export interface NewMessage {
  readonly messageId: string;
  readonly kind: OutboxRecord['kind'];
  readonly eventId: string | null;
  readonly subject: string;
  readonly recipients: readonly string[];
  readonly inReplyTo: string | null;
  /** The composed message, in the mailer's own form; kept as it is. */
  readonly content: string;
  /** When it may leave. */
  readonly dueAt: string;
}

/** `stale`: the event changed meanwhile (a verdict, a mail that left). Nothing was written: read again and decide again. */
export type CommitOutcome =
  | { readonly kind: 'committed'; readonly fileId: number | null }
  | { readonly kind: 'stale'; readonly eventId: string };

export interface EventFilter {
  /** Changed at or after this time. */
  readonly since?: string;
  readonly pulsar?: string;
  /** The shown state. */
  readonly state?: PulsarEvent['state'];
  readonly epochFromMjd?: number;
}

export interface VerdictInput {
  readonly verdict: 'accept' | 'reject' | 'reopen';
  readonly by: string;
  readonly note: string;
  readonly at: string;
  /** The revision the reviewer had on the screen; another on record is a conflict. */
  readonly expectedRevision?: number;
}

export type VerdictOutcome =
  /** `repeated`: the very same verdict was on record already; nothing was added. */
  | { readonly kind: 'recorded' | 'repeated'; readonly record: EventRecord }
  | { readonly kind: 'conflict'; readonly message: string; readonly record: EventRecord }
  | { readonly kind: 'unknown event' };

/** One message to one recipient, marked as being attempted before the caller opens a socket. */
export interface ClaimedMail extends OutboxRecord {
  readonly inReplyTo: string | null;
  readonly content: string;
}

/** What became of an attempt. */
export type MailOutcome =
  /** With a remark where the message could not leave as it was. */
  | { readonly kind: 'delivered'; readonly at: string; readonly remark?: string }
  /** It certainly did not arrive; try again then. */
  | { readonly kind: 'later'; readonly dueAt: string; readonly error: string }
  /** It may have arrived. Sent once more, marked; a second such end expires it. */
  | { readonly kind: 'unknown'; readonly dueAt: string; readonly error: string; readonly at: string }
  | { readonly kind: 'refused'; readonly error: string; readonly at: string }
  | { readonly kind: 'expired'; readonly error: string; readonly at: string };

export interface OutboxFilter {
  readonly state?: OutboxRecord['state'];
  readonly kind?: OutboxRecord['kind'];
  readonly eventId?: string;
  /** Queued first at or after this time. */
  readonly since?: string;
  /** Refused or expired at or after this time; without what newer mail replaced. */
  readonly givenUpSince?: string;
  /** That could leave at this time at the earliest. */
  readonly mayLeaveSince?: string;
}

export interface OutboxCounts {
  readonly queued: number;
  readonly attempting: number;
  readonly delivered: number;
  readonly refused: number;
  readonly expired: number;
  /** Since when the oldest message not yet settled could have left: ahead of now while all are held. */
  readonly oldestWaitingSince: string | null;
}

export interface EventChangeLine {
  readonly event: PulsarEvent;
  readonly what: string;
  /** In words, whether it was mailed and why; null: not on record. */
  readonly alert: string | null;
  readonly at: string;
  /** The event is new with it. */
  readonly isFirst: boolean;
}

export type OpenFailureKind =
  | 'held by another instance'
  | 'newer schema'
  | 'older schema'
  | 'damaged'
  | 'nothing on record'
  | 'unsafe folder'
  | 'unsuitable library'
  | 'storage fault';

/** Why the state folder was not opened, in words for the operator; nothing was changed. */
export interface OpenFailure {
  readonly kind: OpenFailureKind;
  readonly message: string;
}
