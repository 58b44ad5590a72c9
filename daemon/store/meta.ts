import { type Db, row, run } from './connection.ts';

/** Small facts of the daemon's own: which silences were reported, which program version wrote last. */

export function read(db: Db, key: string): string | null {
  return row<{ value: string }>(db, 'SELECT value FROM meta WHERE key = ?', key)?.value ?? null;
}

export function write(db: Db, key: string, value: string): void {
  run(
    db,
    'INSERT INTO meta (key, value) VALUES (?, ?) ON CONFLICT (key) DO UPDATE SET value = excluded.value',
    key,
    value,
  );
}
