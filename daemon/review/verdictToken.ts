import { createHmac, randomBytes, timingSafeEqual } from 'node:crypto';

/**
 * The proof that a form was filled in on a page that this process served to this session: an HMAC-SHA-256 over what the form is for, keyed by
 * a secret that lives as long as the process. A form from before a restart, for another event, revision or session, does not pass.
 */
export interface VerdictTokens {
  /** @param session its id; empty: nobody logs in here */
  issue(eventId: string, revision: number, session?: string): string;
  accepts(token: string, eventId: string, revision: number, session?: string): boolean;
  /** For the forms that concern no event. */
  issueFor(form: OtherForm, session: string): string;
  acceptsFor(token: string, form: OtherForm, session: string): boolean;
}

export type OtherForm = 'log in' | 'log out';

export function createVerdictTokens(secret: Uint8Array = randomBytes(32)): VerdictTokens {
  const digest = (...parts: readonly (string | number)[]): Buffer =>
    createHmac('sha256', secret).update(JSON.stringify(parts)).digest();
  const isSame = (token: string, wanted: Buffer): boolean => {
    const given = Buffer.from(token, 'base64url');
    return given.length === wanted.length && timingSafeEqual(given, wanted);
  };
  const ofVerdict = (eventId: string, revision: number, session: string) =>
    digest('verdict', revision, eventId, session);
  return {
    issue: (eventId, revision, session = '') => ofVerdict(eventId, revision, session).toString('base64url'),
    accepts: (token, eventId, revision, session = '') => isSame(token, ofVerdict(eventId, revision, session)),
    issueFor: (form, session) => digest(form, session).toString('base64url'),
    acceptsFor: (token, form, session) => isSame(token, digest(form, session)),
  };
}
