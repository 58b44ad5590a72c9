import { join } from 'node:path';
import Database from 'better-sqlite3';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { connect } from '../../../daemon/store/connection.ts';
import { MIGRATIONS, migrate } from '../../../daemon/store/migrations.ts';
import { verify } from '../../../daemon/store/verify.ts';
import { open, temporaryFolder } from './sample.ts';

let folder: ReturnType<typeof temporaryFolder>;
beforeEach(() => {
  folder = temporaryFolder();
});
afterEach(() => folder.remove());

const file = () => join(folder.path, 'record.db');

/** A signed verdict, by plain SQL: what is tested is what the database itself lets nobody do. */
const SIGNED = `
INSERT INTO events (id, pulsar, detector_state, state, epoch_mjd, revision, told, body, created_at, changed_at)
  VALUES ('kr-1', 'KR 1', 'confirmed', 'accepted', 61000.5, 2, 1, '{}', '2026-03-01', '2026-03-02');
INSERT INTO event_changes (event_id, revision, at, what, body) VALUES ('kr-1', 1, '2026-03-01', 'confirmed', '{}');
INSERT INTO event_changes (event_id, revision, at, what, body) VALUES ('kr-1', 2, '2026-03-02', 'accepted', '{}');
INSERT INTO verdicts (event_id, verdict, reviewer, note, at, revision)
  VALUES ('kr-1', 'accept', 'duty', 'seen', '2026-03-02', 1);`;

describe('the trail of verdicts', () => {
  test.each([
    ['UPDATE verdicts SET note = ?', 'never changed'],
    ['UPDATE verdicts SET reviewer = ?', 'never changed'],
    ['UPDATE verdicts SET at = ?', 'never changed'],
    ["UPDATE verdicts SET verdict = 'reject' WHERE note <> ?", 'never changed'],
    ['DELETE FROM verdicts WHERE note <> ?', 'never deleted'],
    ["INSERT OR REPLACE INTO verdicts VALUES (1, 'kr-1', 'reject', 'timing', ?, '2026-03-03', 1)", 'never replaced'],
    [
      "INSERT OR REPLACE INTO verdicts (event_id, verdict, reviewer, note, at, revision) VALUES ('kr-1', 'reject', 'x', ?, 'y', 1)",
      'never replaced',
    ],
  ])('stands: %s', (sql, why) => {
    open(folder.path).close();
    const db = connect(file(), { mustExist: true });
    db.exec(SIGNED);
    expect(() => db.prepare(sql).run('other')).toThrow(why);
    expect(db.prepare('SELECT reviewer, verdict, note, at FROM verdicts').all()).toEqual([
      { reviewer: 'duty', verdict: 'accept', note: 'seen', at: '2026-03-02' },
    ]);
    db.close();
  });

  test('goes on, and follows an event whose id late data move', () => {
    open(folder.path).close();
    const db = connect(file(), { mustExist: true });
    db.exec(SIGNED);
    db.exec("UPDATE events SET id = 'kr-2' WHERE id = 'kr-1'");
    db.exec(
      "INSERT INTO verdicts (event_id, verdict, reviewer, note, at, revision) VALUES ('kr-2', 'reopen', 't', '', 'z', 2)",
    );
    expect(db.prepare('SELECT event_id, revision FROM verdicts ORDER BY id').raw().all()).toEqual([
      ['kr-2', 1],
      ['kr-2', 2],
    ]);
    db.close();
  });

  test('C10: an older record with verdicts is brought up, with a copy beside it, and is protected from then on', () => {
    const before = MIGRATIONS.findIndex(({ name }) => name.includes('verdicts that nothing can change'));
    const old = connect(file(), { mustExist: false });
    migrate(old, MIGRATIONS.slice(0, before));
    old.exec(SIGNED);
    migrate(old);
    expect(verify(old)).toEqual([]);
    expect(() => old.exec("UPDATE verdicts SET note = ''")).toThrow('never changed');
    old.close();
    const copy = new Database(join(folder.path, `before-schema-${MIGRATIONS.length}.db`), { readonly: true });
    expect(copy.prepare('SELECT note FROM verdicts').pluck().all()).toEqual(['seen']);
    copy.close();
  });
});
