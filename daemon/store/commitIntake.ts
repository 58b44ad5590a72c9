import * as arrivals from './arrivals.ts';
import { type Db, inTransaction } from './connection.ts';
import { step } from './crashStep.ts';
import { dropEvent, upsertEvent } from './events.ts';
import { insertFile, insertQuarantined } from './files.ts';
import { enqueue, supersede } from './outbox.ts';
import { putPulsarReport } from './reports.ts';
import type { CommitOutcome, IntakeBatch } from './shapes.ts';

/** Thrown inside the transaction to undo it; the caller gets the typed outcome. */
class Stale extends Error {
  readonly eventId: string;
  constructor(eventId: string) {
    super(`${eventId} changed meanwhile`);
    this.eventId = eventId;
  }
}

/** What a file said, what that changed and the mail it causes: all of it or none of it. */
export function commitIntake(db: Db, batch: IntakeBatch): CommitOutcome {
  step('before intake');
  try {
    const fileId = inTransaction(db, () => {
      const file = writeFile(db, batch);
      writeArrivals(db, batch, file);
      writeDecision(db, batch);
      return file;
    });
    step('after intake');
    return { kind: 'committed', fileId };
  } catch (error) {
    if (error instanceof Stale) return { kind: 'stale', eventId: error.eventId };
    throw error;
  }
}

function writeFile(db: Db, batch: IntakeBatch): number | null {
  const { file, at } = batch;
  if (file === null) {
    if (batch.arrivals.length + batch.sightings.length + batch.quarantined.length > 0) {
      throw new Error('Rows need the file they came from.');
    }
    return null;
  }
  const revised = batch.arrivals.filter((arrival) => arrival.revises !== null).length;
  const counts = {
    stored: batch.arrivals.length - revised,
    same: batch.sightings.length,
    revised,
    quarantined: batch.quarantined.filter((row) => row.line !== null).length,
  };
  const fileId = insertFile(db, file, counts, at);
  step('file written');
  insertQuarantined(db, fileId, batch.quarantined, at);
  step('quarantine written');
  return fileId;
}

function writeArrivals(db: Db, batch: IntakeBatch, fileId: number | null): void {
  if (fileId !== null) {
    arrivals.insertArrivals(db, fileId, batch.arrivals);
    step('arrivals written');
    arrivals.insertSightings(db, fileId, batch.sightings);
    step('sightings written');
  }
  arrivals.changeStatuses(db, fileId, batch.statusChanges, batch.at);
  step('statuses changed');
  arrivals.retimeArrivals(db, batch.retimed);
  step('arrivals retimed');
}

function writeDecision(db: Db, batch: IntakeBatch): void {
  for (const report of batch.reports) putPulsarReport(db, report, batch.at);
  step('reports written');
  for (const id of batch.droppedEvents) {
    if (dropEvent(db, id) === 'stale') throw new Stale(id);
  }
  for (const upsert of batch.events) {
    if (upsertEvent(db, upsert, batch.at) === 'stale') throw new Stale(upsert.event.id);
    step('event written');
  }
  for (const messageId of batch.supersededMessages) supersede(db, messageId);
  for (const message of batch.messages) enqueue(db, message, batch.at);
  step('messages written');
}
