import type { QuarantinedRow } from '../../alerts/morningReview.ts';
import type { TimedArrival } from '../../detectors/arrival.ts';
import type { PulsarTimes } from '../../detectors/site/pulsarTimes.ts';
import type { Mjd } from '../../detectors/time/mjd.ts';
import type {
  ArrivalOrigin,
  ArrivalRecord,
  EventRecord,
  FileRecord,
  ListedEvent,
  MailAttempt,
  OutboxRecord,
} from '../records.ts';
import * as arrivals from './arrivals.ts';
import { writeBackup } from './backup.ts';
import { commitIntake } from './commitIntake.ts';
import type { Db } from './connection.ts';
import { type RecordCounts, recordCounts, sqliteVersion } from './counts.ts';
import * as events from './events.ts';
import * as files from './files.ts';
import type { InstanceLock } from './instanceLock.ts';
import * as meta from './meta.ts';
import * as morning from './morning.ts';
import * as outbox from './outbox.ts';
import * as recent from './recent.ts';
import * as reports from './reports.ts';
import * as sessions from './sessions.ts';
import type {
  ClaimedMail,
  CommitOutcome,
  EventChangeLine,
  EventFilter,
  IntakeBatch,
  KnownFile,
  MailOutcome,
  NewMessage,
  OutboxCounts,
  OutboxFilter,
  PulsarReportRow,
  VerdictInput,
  VerdictOutcome,
} from './shapes.ts';
import * as verdicts from './verdicts.ts';
import { verify } from './verify.ts';
import { verifyBeside } from './verifyBeside.ts';

/**
 * The record: one SQLite database in the state folder, and with a writer the lock that makes it the only one. Every method is
 * one statement or one transaction. Errors of the database are thrown as they come: `storageTrouble` names their family.
 */
export class Store {
  readonly #db: Db;
  readonly #lock: InstanceLock | null;
  readonly #isInPlace: () => boolean;

  /** Made by `openStore` alone. */
  constructor(db: Db, lock: InstanceLock | null, isInPlace: () => boolean) {
    this.#db = db;
    this.#lock = lock;
    this.#isInPlace = isInPlace;
  }

  // --- intake

  /** The last revision of a path; a name that is not UTF-8 is given by its bytes. */
  knownFile(feed: string, path: string | { readonly bytesHex: string }): KnownFile | null {
    return files.knownFile(this.#db, feed, path);
  }

  /** The same bytes with another stat signature: a file that was only touched. */
  noteUnchanged(fileId: number, signature: string): void {
    files.noteUnchanged(this.#db, fileId, signature);
  }

  /** Marks that reading begins; answers how often it began, this time included, without an end: 1 when all is well. */
  noteReadingStarts(feed: string, path: string | { readonly bytesHex: string }, sha256: string): number {
    return files.noteReadingStarts(this.#db, feed, path, sha256);
  }

  /** The arrivals that the last readable revision of a path contains, in line order. */
  arrivalsOfFile(feed: string, path: string | { readonly bytesHex: string }): ArrivalRecord[] {
    return arrivals.arrivalsOfFile(this.#db, feed, path);
  }

  /** Those of `keys` that the last readable revision of some other path contains too. */
  standingElsewhere(keys: Iterable<string>, feed: string, path: string | { readonly bytesHex: string }): Set<string> {
    return arrivals.standingElsewhere(this.#db, keys, feed, path);
  }

  arrival(key: string): ArrivalRecord | null {
    return arrivals.arrival(this.#db, key);
  }

  /** Any status, within `seconds` of a time as received. */
  arrivalsNear(pulsar: string, time: Mjd, seconds: number): ArrivalRecord[] {
    return arrivals.arrivalsNear(this.#db, pulsar, time, seconds);
  }

  /** All of a pulsar, any status, by TDB and then key. */
  arrivals(pulsar: string): ArrivalRecord[] {
    return arrivals.arrivalsOf(this.#db, pulsar);
  }

  liveArrivals(pulsar: string): ArrivalRecord[] {
    return arrivals.liveArrivalsOf(this.#db, pulsar);
  }

  /** What the detector takes in: the live arrivals that have a TDB, by TDB and then key. */
  timedArrivals(pulsar: string): TimedArrival[] {
    return arrivals.timedArrivalsOf(this.#db, pulsar);
  }

  /** Names of all pulsars with arrivals, sorted by code point. */
  pulsars(): string[] {
    return arrivals.pulsars(this.#db);
  }

  pulsarReport(pulsar: string): PulsarReportRow | null {
    return reports.pulsarReport(this.#db, pulsar);
  }

  /** Without `times`: those come from `pulsarTimes`. */
  pulsarReports(): PulsarReportRow[] {
    return reports.pulsarReports(this.#db);
  }

  pulsarTimes(): PulsarTimes[] {
    return reports.pulsarTimes(this.#db);
  }

  /** Pulsars that could not be decided about, for a fault of the program. */
  faultyPulsars(): string[] {
    return reports.faultyPulsars(this.#db);
  }

  unlockedPulsars(): { readonly pulsar: string; readonly arrivals: number }[] {
    return reports.unlockedPulsars(this.#db);
  }

  /** One transaction; a batch that breaks a rule of the record is thrown and leaves nothing. */
  commitIntake(batch: IntakeBatch): CommitOutcome {
    this.#requireLock();
    return commitIntake(this.#db, batch);
  }

  // --- events

  /** Oldest epoch first. */
  events(filter: EventFilter = {}): ListedEvent[] {
    return events.listEvents(this.#db, filter);
  }

  event(idOrFormerId: string): EventRecord | null {
    return events.eventRecord(this.#db, idOrFormerId);
  }

  /** Every event on record, for matching the next decision against. */
  publishedEvents(): ListedEvent[] {
    return events.listEvents(this.#db, {});
  }

  /** Works beside a running daemon. */
  recordVerdict(eventId: string, input: VerdictInput): VerdictOutcome {
    return verdicts.recordVerdict(this.#db, eventId, input);
  }

  // --- who is logged in

  putSession(session: sessions.SessionRow): void {
    sessions.putSession(this.#db, session);
  }

  session(id: string): sessions.SessionRow | null {
    return sessions.session(this.#db, id);
  }

  endSession(id: string): void {
    sessions.endSession(this.#db, id);
  }

  endSessionsOlderThan(now: string): void {
    sessions.endSessionsOlderThan(this.#db, now);
  }

  /** Works beside a running daemon. Answers how many there were. */
  endSessionsOf(reviewer: string): number {
    return sessions.endSessionsOf(this.#db, reviewer);
  }

  // --- mail

  /** The digest of a civil date, at most one for ever; `false`: it was queued before. */
  commitDigest(civilDate: string, message: NewMessage, at: string): boolean {
    this.#requireLock();
    return outbox.commitDigest(this.#db, civilDate, message, at);
  }

  /** A message about the daemon itself or a test, together with what is to be remembered about it. */
  commitNotice(message: NewMessage, at: string, remember: Readonly<Record<string, string>> = {}): void {
    this.#requireLock();
    outbox.commitNotice(this.#db, message, at, remember);
  }

  /** The next message that is due, marked as attempted. One at a time, so that a crash leaves at most one in doubt. */
  claimDue(now: string): ClaimedMail | null {
    this.#requireLock();
    return outbox.claimDue(this.#db, now);
  }

  settle(outboxId: number, outcome: MailOutcome): void {
    this.#requireLock();
    outbox.settle(this.#db, outboxId, outcome);
  }

  /** Gives up what was queued first before that time and still waits; answers what it gave up. */
  expireOlderThan(createdBefore: string, end: { readonly error: string; readonly at: string }): OutboxRecord[] {
    this.#requireLock();
    return outbox.expireOlderThan(this.#db, createdBefore, end);
  }

  /** In the order of queueing. */
  outbox(filter: OutboxFilter = {}): OutboxRecord[] {
    return outbox.listOutbox(this.#db, filter);
  }

  /** By the id of the outbox's row, oldest first. */
  mailAttempts(outboxIds: readonly number[]): Map<number, MailAttempt[]> {
    return outbox.attemptsAt(this.#db, outboxIds);
  }

  outboxCounts(): OutboxCounts {
    return outbox.outboxCounts(this.#db);
  }

  // --- the morning

  quarantinedSince(since: string): QuarantinedRow[] {
    return morning.quarantinedSince(this.#db, since);
  }

  /** Files that could not be read or of which most rows could not be used. */
  unusableFilesSince(since: string): morning.UnusableFile[] {
    return morning.unusableFilesSince(this.#db, since);
  }

  /** Newest first. */
  recentFiles(most: number): FileRecord[] {
    return recent.recentFiles(this.#db, most);
  }

  /** Newest first, without that of files delivered again since. */
  recentQuarantine(most: number): QuarantinedRow[] {
    return recent.recentQuarantine(this.#db, most);
  }

  /** Of arrivals by key: as received, and the line that brought them. */
  origins(keys: readonly string[]): ArrivalOrigin[] {
    return recent.origins(this.#db, keys);
  }

  /** Rows that name a pulsar and could not be used, newest first, without that of files delivered again since. */
  quarantineOf(pulsar: string): QuarantinedRow[] {
    return recent.quarantineOf(this.#db, pulsar);
  }

  intakeSince(since: string): { files: number; arrivals: number; pulsars: number } {
    return morning.intakeSince(this.#db, since);
  }

  /** Every change of an event, newest first. */
  eventChangesSince(since: string): EventChangeLine[] {
    return morning.eventChangesSince(this.#db, since);
  }

  /** Feed → when its last file was taken in. */
  lastFileByFeed(): Map<string, string> {
    return morning.lastFileByFeed(this.#db);
  }

  /** Pulsar → MJD (TDB) of its last live arrival. */
  lastArrivalByPulsar(): Map<string, number> {
    return morning.lastArrivalByPulsar(this.#db);
  }

  /** The last days with live arrivals of a pulsar, MJD as received, in order of time. */
  lastDays(pulsar: string, most: number): number[] {
    return morning.lastDays(this.#db, pulsar, most);
  }

  lastDigest(): { readonly civilDate: string; readonly at: string } | null {
    return outbox.lastDigest(this.#db);
  }

  // --- upkeep

  counts(): RecordCounts {
    return recordCounts(this.#db);
  }

  sqliteVersion(): string {
    return sqliteVersion(this.#db);
  }

  meta(key: string): string | null {
    return meta.read(this.#db, key);
  }

  setMeta(key: string, value: string): void {
    meta.write(this.#db, key, value);
  }

  /** A consistent, checked copy, while others write. `file` appears only when complete, and replaces an older one. */
  backup(file: string): Promise<void> {
    return writeBackup(this.#db, file);
  }

  /** The invariants of the record, checked in full; each problem in words. Empty: all hold. */
  verify(): string[] {
    return verify(this.#db);
  }

  /** The same in a process of its own, while the daemon goes on. */
  verifyBeside(): Promise<string[]> {
    return verifyBeside(this.#db.name);
  }

  /** False when the database file was moved, removed or replaced under the running program: stop at once. */
  isInPlace(): boolean {
    return this.#isInPlace();
  }

  close(): void {
    this.#db.close();
    this.#lock?.release();
  }

  #requireLock(): void {
    if (this.#lock === null) throw new Error('This needs a store opened as the daemon; it was opened as a reader.');
  }
}
