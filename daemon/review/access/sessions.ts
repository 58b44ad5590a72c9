import { createHash, randomBytes } from 'node:crypto';
import type { Clock } from '../../clock.ts';

/**
 * Who is logged in. A visitor holds a random token; the record holds its hash, the name, and when it ends. A token that somebody
 * reads in a copy of the record opens nothing.
 */
export interface Session {
  /** SHA-256 of the token, hexadecimal. */
  readonly id: string;
  readonly reviewer: string;
}

export interface SessionRecord extends Session {
  /** ISO 8601 UTC. */
  readonly startedAt: string;
  readonly expiresAt: string;
}

/** Where sessions are kept: they outlive a restart. */
export interface SessionShelf {
  put(session: SessionRecord): void;
  find(id: string): SessionRecord | null;
  end(id: string): void;
  /** Those that ended by themselves. */
  endOlderThan(now: string): void;
}

export interface Sessions {
  /** A new token; that of an earlier session, if one is given, opens nothing any more. */
  open(reviewer: string, earlier: string | null): string;
  find(token: string): Session | null;
  end(token: string): void;
}

const TOKEN_BYTES = 32;
/** One working day. */
export const SESSION_MS = 12 * 3_600_000;
const TOKEN = /^[A-Za-z0-9_-]{43}$/;

export function createSessions(shelf: SessionShelf, clock: Clock): Sessions {
  /** Session → monotonic time at which this process saw it first: a wall clock that is set back prolongs nothing. */
  const firstSeen = new Map<string, number>();
  const end = (token: string) => {
    firstSeen.delete(idOf(token));
    shelf.end(idOf(token));
  };
  const isOver = ({ id, startedAt, expiresAt }: SessionRecord) => {
    const nowMs = clock.now().getTime();
    const seenMs = firstSeen.get(id) ?? clock.monotonicMs();
    firstSeen.set(id, seenMs);
    const withinWallTime = nowMs >= Date.parse(startedAt) - CLOCK_PLAY_MS && nowMs < Date.parse(expiresAt);
    return !withinWallTime || clock.monotonicMs() - seenMs >= SESSION_MS;
  };
  return {
    open(reviewer, earlier) {
      if (earlier !== null) end(earlier);
      const now = clock.now();
      shelf.endOlderThan(now.toISOString());
      for (const [id, seenMs] of firstSeen) if (clock.monotonicMs() - seenMs >= SESSION_MS) firstSeen.delete(id);
      const token = randomBytes(TOKEN_BYTES).toString('base64url');
      const expiresAt = new Date(now.getTime() + SESSION_MS).toISOString();
      firstSeen.set(idOf(token), clock.monotonicMs());
      shelf.put({ id: idOf(token), reviewer, startedAt: now.toISOString(), expiresAt });
      return token;
    },
    find(token) {
      if (!TOKEN.test(token)) return null;
      const found = shelf.find(idOf(token));
      if (found === null) return null;
      if (!isOver(found)) return { id: found.id, reviewer: found.reviewer };
      end(token);
      return null;
    },
    end,
  };
}

/** How far a wall clock may be set back without ending a session. */
const CLOCK_PLAY_MS = 60_000;

function idOf(token: string): string {
  return createHash('sha256').update(token).digest('hex');
}
