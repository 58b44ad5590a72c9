import { type Db, row, rows } from './connection.ts';
import { SCHEMA_VERSION } from './migrations.ts';

/** The invariants that must hold at any time, whatever went wrong before. Read only; minutes on a very large record. */
export function verify(db: Db): string[] {
  return [...storageProblems(db), ...fileProblems(db), ...eventProblems(db), ...numberProblems(db)];
}

/** The database itself is whole and of a known schema. */
function storageProblems(db: Db): string[] {
  const integrity = rows<{ integrity_check: string }>(db, 'PRAGMA integrity_check')
    .map((r) => r.integrity_check)
    .filter((line) => line !== 'ok');
  const orphans = rows<{ table: string; rowid: number | null; parent: string }>(db, 'PRAGMA foreign_key_check').map(
    (r) => `${r.table} row ${r.rowid} points to nothing in ${r.parent}`,
  );
  const version = db.pragma('user_version', { simple: true });
  const schema = version === SCHEMA_VERSION ? [] : [`schema version ${version}, not ${SCHEMA_VERSION}`];
  return [...integrity, ...orphans, ...schema];
}

/** Every row that a file had is stored, known already, or quarantined with a reason. */
function fileProblems(db: Db): string[] {
  return rows<{ feed: string; path: string; revision: number }>(
    db,
    `SELECT feed, path, revision FROM files f
     WHERE row_count <> stored + same + revised + quarantined
        OR stored + revised <> (SELECT count(*) FROM arrivals WHERE file_id = f.id)
        OR stored + revised + same <> (SELECT count(*) FROM sightings WHERE file_id = f.id)
        OR quarantined <> (SELECT count(*) FROM quarantine WHERE file_id = f.id AND line IS NOT NULL)`,
  ).map((r) => `${r.feed}/${r.path} revision ${r.revision}: its rows do not add up`);
}

/** One identity an event, an unbroken history, a state that follows from the verdicts; one copy a message and recipient. */
function eventProblems(db: Db): string[] {
  const find = (what: string, sql: string) => rows<{ id: string }>(db, sql).map((r) => `${r.id}: ${what}`);
  return [
    ...find(
      'is both a former and a present id',
      'SELECT former_id AS id FROM former_ids JOIN events ON id = former_id',
    ),
    ...find(
      'its history has a gap',
      `SELECT id FROM events e WHERE revision <> (SELECT count(*) FROM event_changes WHERE event_id = e.id)
         OR revision <> (SELECT max(revision) FROM event_changes WHERE event_id = e.id)`,
    ),
    ...find(
      'its state does not follow from its verdicts',
      `SELECT id FROM events e WHERE state <> CASE
         (SELECT verdict FROM verdicts WHERE event_id = e.id ORDER BY id DESC LIMIT 1)
         WHEN 'accept' THEN 'accepted' WHEN 'reject' THEN 'rejected' ELSE detector_state END`,
    ),
    ...find(
      'a recipient has it twice in the outbox',
      'SELECT message_id AS id FROM outbox GROUP BY message_id, recipient HAVING count(*) > 1',
    ),
    ...find(
      'it left, but the event counts as untold',
      `SELECT DISTINCT e.id FROM events e JOIN messages m ON m.event_id = e.id JOIN outbox o USING (message_id)
       WHERE e.told = 0 AND o.attempts > 0`,
    ),
  ];
}

/** No number anywhere that is not one. */
function numberProblems(db: Db): string[] {
  const columns = rows<{ table: string; column: string }>(
    db,
    `SELECT t.name AS "table", c.name AS "column" FROM sqlite_schema t, pragma_table_info(t.name) c
     WHERE t.type = 'table' AND c.type = 'REAL' ORDER BY t.name, c.cid`,
  );
  const notFinite = columns
    .filter(({ table, column }) => {
      const bad = `typeof("${column}") <> 'real' OR abs("${column}") > 1.7976931348623157e308`;
      return row(db, `SELECT 1 FROM "${table}" WHERE ${bad} LIMIT 1`) !== undefined;
    })
    .map(({ table, column }) => `${table}.${column} holds something that is not a finite number`);
  const uncertain = rows<{ key: string }>(db, 'SELECT key FROM arrivals WHERE NOT uncertainty_us > 0').map(
    (r) => `arrival ${r.key} has no positive uncertainty`,
  );
  return [...notFinite, ...uncertain];
}
