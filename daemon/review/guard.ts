import { isIP } from 'node:net';
import type { NamedProxy } from '../config/reviewSettings.ts';
import { isLoopback } from '../loopback.ts';

/** Judges a request by its head alone, before anything is routed or a byte of its body is read. Pure. */
export interface RequestHead {
  readonly method: string;
  /** The request target as it stood on the request line. */
  readonly target: string;
  /** Name, value, name, value … as received, so that a header sent twice is seen twice. */
  readonly rawHeaders: readonly string[];
}

export interface Refusal {
  readonly status: 400 | 403 | 405 | 414 | 421;
  readonly title: string;
  readonly advice: string;
}

export const ALLOWED_METHODS = ['GET', 'HEAD', 'POST'] as const;
const LONGEST_TARGET = 2048;

/** By which names this page goes, and who may speak for others. */
export interface Entrance {
  readonly scheme: 'http' | 'https';
  /** Of a request that comes directly: the value of `Host`, in lower case. */
  readonly isOwnAuthority: (authority: string) => boolean;
  readonly proxy: NamedProxy | null;
}

/** Who asks, as far as the connection tells. */
export interface Visitor {
  readonly address: string;
  /** Through the named proxy. */
  readonly forwarded: boolean;
  /** The browser speaks TLS, to us or to the proxy. */
  readonly secure: boolean;
  /** Scheme and authority of the page as the browser knows it. */
  readonly origin: string;
}

/** The values of `Host` under which a plain listener answers: the loopback names and the configured one, with the port. */
export function authoritiesOf(host: string, port: number): ReadonlySet<string> {
  const names = new Set(['localhost', '127.0.0.1', '[::1]', host.includes(':') ? `[${host}]` : host.toLowerCase()]);
  const authorities = new Set<string>();
  for (const name of names) {
    authorities.add(`${name}:${port}`);
    if (port === 80) authorities.add(name);
  }
  return authorities;
}

/** Judges a request head that came from `peer`, the other end of the connection: a visitor, or why none is let in. */
export function admit(head: RequestHead, peer: string, entrance: Entrance): Visitor | Refusal {
  if (!ALLOWED_METHODS.some((method) => method === head.method)) {
    return {
      status: 405,
      title: 'Method not allowed',
      advice: 'This page answers GET and HEAD, and POST for a verdict.',
    };
  }
  const refusal = refusalOfTarget(head.target);
  if (refusal !== null) return refusal;
  const visitor = visitorOf(head, plainAddress(peer), entrance);
  return 'status' in visitor ? visitor : (refusalOfOrigin(head, visitor.origin) ?? visitor);
}

/** An IPv4 address that came in over IPv6 is itself. */
function plainAddress(peer: string): string {
  return peer.replace(/^::ffff:(?=\d+\.)/i, '');
}

function refusalOfTarget(target: string): Refusal | null {
  if (target.length > LONGEST_TARGET) {
    return { status: 414, title: 'Address too long', advice: 'Open the start page and follow its links.' };
  }
  const malformed: Refusal = {
    status: 400,
    title: 'Malformed address',
    advice: 'The address is not one this page makes. Open the start page and follow its links.',
  };
  if (!target.startsWith('/') || target.startsWith('//')) return malformed;
  const decoded = decodedOrNull(target);
  if (decoded === null || hasControlOrBackslash(decoded)) return malformed;
  const path = decoded.split('?', 1)[0] ?? '';
  return path.split('/').some((segment) => segment === '.' || segment === '..') ? malformed : null;
}

function decodedOrNull(text: string): string | null {
  try {
    return decodeURIComponent(text);
  } catch {
    return null;
  }
}

function hasControlOrBackslash(text: string): boolean {
  for (const character of text) {
    if (character < ' ' || character === '\u007f' || character === '\\') return true;
  }
  return false;
}

/** The Host check stops a foreign site that points its own name at this address. */
function visitorOf(head: RequestHead, peer: string, entrance: Entrance): Visitor | Refusal {
  const hosts = valuesOf(head, 'host');
  const [host] = hosts;
  if (hosts.length !== 1 || host === undefined || host === '') {
    return { status: 400, title: 'Host missing or given twice', advice: 'A request names exactly one host.' };
  }
  const { proxy, scheme } = entrance;
  const authority = host.toLowerCase();
  if (proxy?.addresses.includes(peer) && valuesOf(head, 'x-forwarded-for').length > 0) {
    return throughProxy(head, proxy.origin, authority, entrance);
  }
  if (proxy !== null && !isLoopback(peer)) {
    return { status: 403, title: 'Not through the proxy', advice: `Open ${proxy.origin}/ instead.` };
  }
  if (!entrance.isOwnAuthority(authority)) return NOT_OUR_NAME;
  return { address: peer, forwarded: false, secure: scheme === 'https', origin: `${scheme}://${authority}` };
}

const NOT_OUR_NAME: Refusal = {
  status: 421,
  title: 'Not a name of this page',
  advice: 'Use the address the daemon printed at its start. Through a tunnel, give both ends the same port.',
};

/** What the named proxy says of the browser's side: its own address stands last, added by the proxy itself. */
function throughProxy(head: RequestHead, origin: string, host: string, entrance: Entrance): Visitor | Refusal {
  const { host: ownAuthority, protocol } = new URL(origin);
  const names = valuesOf(head, 'x-forwarded-host');
  const isNamed = names.length > 0 ? names.length === 1 && names[0]?.toLowerCase() === ownAuthority : true;
  if (!isNamed || (host !== ownAuthority && !entrance.isOwnAuthority(host))) return NOT_OUR_NAME;
  const schemes = valuesOf(head, 'x-forwarded-proto');
  if (schemes.some((scheme) => `${scheme.toLowerCase()}:` !== protocol)) {
    return { status: 403, title: 'Not by the right way', advice: `Open ${origin}/ instead.` };
  }
  const address = valuesOf(head, 'x-forwarded-for').at(-1)?.split(',').at(-1)?.trim() ?? '';
  if (isIP(address) === 0) {
    return { status: 400, title: 'Unknown visitor', advice: 'The proxy must say in X-Forwarded-For who asks.' };
  }
  return { address, forwarded: true, secure: protocol === 'https:', origin };
}

/** An unsafe request must prove by a header no foreign page can set that it comes from this very origin. */
function refusalOfOrigin(head: RequestHead, own: string): Refusal | null {
  if (head.method !== 'POST') return null;
  const origins = valuesOf(head, 'origin');
  const sites = valuesOf(head, 'sec-fetch-site');
  const originProves = origins.length === 1 && origins[0]?.toLowerCase() === own;
  const siteProves = sites.length === 1 && sites[0] === 'same-origin';
  const contradicted = (origins.length > 0 && !originProves) || (sites.length > 0 && !siteProves);
  if ((originProves || siteProves) && !contradicted) return null;
  return {
    status: 403,
    title: 'Not sent from this page',
    advice: 'A verdict is taken only from the form on the page of its event. Nothing was changed.',
  };
}

function valuesOf(head: RequestHead, name: string): string[] {
  const values: string[] = [];
  for (let i = 0; i + 1 < head.rawHeaders.length; i += 2) {
    if (head.rawHeaders[i]?.toLowerCase() === name) values.push((head.rawHeaders[i + 1] ?? '').trim());
  }
  return values;
}
