import { createHash } from 'node:crypto';

/**
 * Names of messages, fixed by what they say: a copy sent again after a crash, or composed again after a restart, is the same
 * message to every mail program (RFC 5322 §3.6.4).
 */

export type EventMailKind = 'first' | 'update' | 'withdrawal' | 'drill';

/** `<event.….r3.update@domain>`, the domain being that of the observatory's contact address. */
export function messageId(of: {
  readonly eventId: string;
  readonly revision: number;
  readonly kind: EventMailKind;
  readonly contact: string;
}): string {
  return `<event.${atom(of.eventId)}.r${of.revision}.${of.kind}@${domainOf(of.contact)}>`;
}

/** For mail that is not about one event; `name` holds what makes it unique, such as the civil date of a digest. */
export function namedMessageId(name: string, contact: string): string {
  return `<${atom(name)}@${domainOf(contact)}>`;
}

/** The domain of a mail address, or `localhost.invalid` (RFC 2606) when there is none. */
export function domainOf(contact: string): string {
  const domain = /@([A-Za-z0-9.-]+)>?\s*$/.exec(contact)?.[1]?.toLowerCase() ?? '';
  return /^[a-z0-9-]+(\.[a-z0-9-]+)*$/.test(domain) ? domain : 'localhost.invalid';
}

/** A dot-atom: what the text has of letters, digits and `-`, with a digest where anything had to go, so that no two collide. */
function atom(text: string): string {
  const plain = text
    .replace(/[^A-Za-z0-9.-]+/g, '-')
    .replace(/^[.-]+|[.-]+$/g, '')
    .replace(/\.{2,}/g, '.')
    .slice(0, 60);
  if (plain === text) return plain;
  return `${plain}-${createHash('sha256').update(text).digest('hex').slice(0, 8)}`.replace(/^-/, '');
}
