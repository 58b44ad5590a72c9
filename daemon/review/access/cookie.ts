import { SESSION_MS } from './sessions.ts';

/**
 * The session's cookie (RFC 6265bis, from memory): out of reach of scripts, sent by our own pages alone, and under TLS bound to this very host by
 * the prefix of its name.
 */
const NAME = 'spinvigil';

const nameOf = (secure: boolean): string => (secure ? `__Host-${NAME}` : NAME);

/** The token that a `Cookie` header carries; null: none, or two, of which one was planted. */
export function tokenIn(header: string | undefined, secure: boolean): string | null {
  const values = (header ?? '').split(';').flatMap((pair) => {
    const cut = pair.indexOf('=');
    return cut > 0 && pair.slice(0, cut).trim() === nameOf(secure) ? [pair.slice(cut + 1).trim()] : [];
  });
  return values.length === 1 ? values[0]! : null;
}

export function cookieWith(token: string, secure: boolean): string {
  return `${nameOf(secure)}=${token}; Path=/; Max-Age=${SESSION_MS / 1000}; HttpOnly; SameSite=Strict${secure ? '; Secure' : ''}`;
}

export function cookieGone(secure: boolean): string {
  return `${nameOf(secure)}=; Path=/; Max-Age=0; HttpOnly; SameSite=Strict${secure ? '; Secure' : ''}`;
}
