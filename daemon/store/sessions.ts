import { type Db, row, run } from './connection.ts';

/** Who is logged in on the review page. The record knows a token by its hash alone. */
export interface SessionRow {
  readonly id: string;
  readonly reviewer: string;
  readonly startedAt: string;
  readonly expiresAt: string;
}

export function putSession(db: Db, { id, reviewer, startedAt, expiresAt }: SessionRow): void {
  run(
    db,
    'INSERT INTO sessions (id, reviewer, started_at, expires_at) VALUES (?, ?, ?, ?)',
    id,
    reviewer,
    startedAt,
    expiresAt,
  );
}

export function session(db: Db, id: string): SessionRow | null {
  return (
    row<SessionRow>(
      db,
      'SELECT id, reviewer, started_at AS startedAt, expires_at AS expiresAt FROM sessions WHERE id = ?',
      id,
    ) ?? null
  );
}

export function endSession(db: Db, id: string): void {
  run(db, 'DELETE FROM sessions WHERE id = ?', id);
}

export function endSessionsOlderThan(db: Db, now: string): void {
  run(db, 'DELETE FROM sessions WHERE expires_at <= ?', now);
}

/** Answers how many there were. */
export function endSessionsOf(db: Db, reviewer: string): number {
  return run(db, 'DELETE FROM sessions WHERE reviewer = ?', reviewer).changes;
}
