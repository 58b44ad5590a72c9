import { join } from 'node:path';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { connect, type Db } from '../../../daemon/store/connection.ts';
import { verify } from '../../../daemon/store/verify.ts';
import { AT, fileBatch, open, sampleMessage, temporaryFolder, upsert } from './sample.ts';

// Each invariant is broken once by hand, and must be found.

let folder: ReturnType<typeof temporaryFolder>;
let db: Db;
beforeEach(() => {
  folder = temporaryFolder();
  const store = open(folder.path);
  store.commitIntake({ ...fileBatch(0, 2), events: [upsert()], messages: [sampleMessage()] });
  store.recordVerdict('KR0417-60003', { verdict: 'accept', by: 'duty', note: '', at: AT });
  store.close();
  db = connect(join(folder.path, 'record.db'), { mustExist: true });
  db.pragma('foreign_keys = OFF');
  db.pragma('ignore_check_constraints = ON');
});
afterEach(() => {
  db.close();
  folder.remove();
});

test('a sound record has no problems', () => {
  expect(verify(db)).toEqual([]);
});

test.each([
  [
    'a lost arrival',
    'DELETE FROM sightings WHERE arrival_id = 1; DELETE FROM barycentred WHERE arrival_id = 1; DELETE FROM arrivals WHERE id = 1',
    /do not add up/,
  ],
  ['a lost sighting', 'DELETE FROM sightings WHERE arrival_id = 1', /do not add up/],
  ['a wrong count', 'UPDATE files SET row_count = 7', /do not add up/],
  ['an orphan', 'UPDATE arrivals SET file_id = 99 WHERE id = 1', /arrivals row 1 points to nothing in files/],
  ['a schema unknown', 'PRAGMA user_version = 77', /schema version 77/],
  [
    'an id that is former and present',
    "INSERT INTO former_ids VALUES ('KR0417-60003', 'KR0417-60003', '')",
    /both a former/,
  ],
  ['a gap in a history', 'DELETE FROM event_changes WHERE revision = 1', /gap/],
  ['a state without a verdict', "UPDATE events SET state = 'rejected'", /does not follow/],
  ['mail that left of an untold event', 'UPDATE outbox SET attempts = 1; UPDATE events SET told = 0', /untold/],
  ['an infinite number', 'UPDATE events SET epoch_mjd = 9e999', /events.epoch_mjd/],
  [
    'a negative uncertainty',
    'UPDATE arrivals SET uncertainty_us = -1 WHERE id = 2',
    /key-000001 has no positive uncertainty/,
  ],
])('%s is found', (_, sql, problem) => {
  db.exec(sql);
  const found = verify(db);
  expect(found.length).toBeGreaterThan(0);
  expect(found.join('\n')).toMatch(problem);
});

test('verdicts and ends of mail are guarded by the database itself', () => {
  expect(() => db.exec('DELETE FROM verdicts')).toThrow(/never deleted/);
  db.exec("UPDATE outbox SET state = 'refused'");
  expect(() => db.exec("UPDATE outbox SET state = 'queued'")).toThrow(/settled/);
});
