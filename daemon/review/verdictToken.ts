import { createHmac, randomBytes, timingSafeEqual } from 'node:crypto';

/**
 * The proof that a verdict was filled in on a form that this process served: an HMAC-SHA-256 over event and revision,
 * keyed by a secret that lives as long as the process. A form from before a restart, or for another event or revision,
 * does not pass.
 */
export interface VerdictTokens {
  issue(eventId: string, revision: number): string;
  accepts(token: string, eventId: string, revision: number): boolean;
}

export function createVerdictTokens(secret: Uint8Array = randomBytes(32)): VerdictTokens {
  const digest = (eventId: string, revision: number): Buffer =>
    createHmac('sha256', secret).update(`verdict\0${revision}\0${eventId}`).digest();
  return {
    issue: (eventId, revision) => digest(eventId, revision).toString('base64url'),
    accepts(token, eventId, revision) {
      const given = Buffer.from(token, 'base64url');
      const wanted = digest(eventId, revision);
      return given.length === wanted.length && timingSafeEqual(given, wanted);
    },
  };
}
