import { type Db, row, rows } from './connection.ts';

/** How much is on record, from what costs no reading through: for the page Health and the monitoring system. */
export interface RecordCounts {
  /** Ever taken in: nothing of these is ever deleted, so that the last number given is how many there were. */
  readonly files: number;
  readonly arrivals: number;
  readonly quarantinedRows: number;
  readonly verdicts: number;
  readonly messages: number;
  readonly eventsByState: Readonly<Record<string, number>>;
  /** The database, bytes. */
  readonly bytes: number;
}

export function recordCounts(db: Db): RecordCounts {
  const last = (table: 'files' | 'arrivals' | 'quarantine' | 'verdicts') =>
    row<{ n: number | null }>(db, `SELECT max(id) AS n FROM ${table}`)?.n ?? 0;
  const states = rows<{ state: string; n: number }>(db, 'SELECT state, count(*) AS n FROM events GROUP BY state');
  const pages = db.pragma('page_count', { simple: true }) as number;
  return {
    files: last('files'),
    arrivals: last('arrivals'),
    quarantinedRows: last('quarantine'),
    verdicts: last('verdicts'),
    messages: row<{ n: number }>(db, 'SELECT count(*) AS n FROM messages')?.n ?? 0,
    eventsByState: Object.fromEntries(states.map(({ state, n }) => [state, n])),
    bytes: pages * (db.pragma('page_size', { simple: true }) as number),
  };
}

export function sqliteVersion(db: Db): string {
  return row<{ version: string }>(db, 'SELECT sqlite_version() AS version')?.version ?? 'unknown';
}
