import { createHash } from 'node:crypto';

/** When to try again, and when to give up. Pure: the same message at the same attempt always gets the same answer. */

const MINUTE_MS = 60_000;
const LONGEST_MS = 60 * MINUTE_MS;
/** A wrong password tried often locks an account: pause at once. */
const AFTER_LOGIN_FAILURE_MS = LONGEST_MS;
/** A server busy with the first copy needs time before it is asked again. */
const AFTER_UNKNOWN_MS = 15 * MINUTE_MS;
export const EXPIRES_AFTER_MS = 5 * 24 * 60 * MINUTE_MS;

export type PauseCause = 'later' | 'login refused' | 'unknown';

/**
 * @param attempts how many were made, counting the one that just failed
 * @returns milliseconds to wait: 1 min doubling to 60 min, each spread by up to ±10 % so that queued mail does not march in step
 */
export function pauseMs(message: { readonly id: string; readonly attempts: number }, cause: PauseCause): number {
  const doubling = Math.min(LONGEST_MS, MINUTE_MS * 2 ** Math.max(0, Math.min(message.attempts - 1, 30)));
  const floor = cause === 'login refused' ? AFTER_LOGIN_FAILURE_MS : cause === 'unknown' ? AFTER_UNKNOWN_MS : 0;
  const spread = createHash('sha256').update(`${message.id} ${message.attempts}`).digest().readUInt32BE(0) / 2 ** 32;
  return Math.round(Math.max(doubling, floor) * (0.9 + 0.2 * spread));
}

/** True once a message has waited five days: no attempt is made any more, and the expiry itself is reported. */
export function hasExpired(createdAt: Date, now: Date): boolean {
  return now.getTime() - createdAt.getTime() >= EXPIRES_AFTER_MS;
}
