import { isIPv4 } from 'node:net';

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

export function isLoopback(host: string): boolean {
  return host === 'localhost' || host === '::1' || (isIPv4(host) && host.startsWith('127.'));
}

/** The values of `Host` under which this server answers: the loopback names and the configured one, with the port. */
export function authoritiesOf(host: string, port: number): ReadonlySet<string> {
  const names = new Set(['localhost', '127.0.0.1', '[::1]', host.includes(':') ? `[${host}]` : host.toLowerCase()]);
  const authorities = new Set<string>();
  for (const name of names) {
    authorities.add(`${name}:${port}`);
    if (port === 80) authorities.add(name);
  }
  return authorities;
}

/** Null: the request may be routed. */
export function refusalOf(head: RequestHead, authorities: ReadonlySet<string>): Refusal | null {
  if (!ALLOWED_METHODS.some((method) => method === head.method)) {
    return {
      status: 405,
      title: 'Method not allowed',
      advice: 'This page answers GET and HEAD, and POST for a verdict.',
    };
  }
  return refusalOfTarget(head.target) ?? refusalOfHost(head, authorities) ?? refusalOfOrigin(head);
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

/** Stops a foreign site that points its own name at this address. */
function refusalOfHost(head: RequestHead, authorities: ReadonlySet<string>): Refusal | null {
  const hosts = valuesOf(head, 'host');
  const [host] = hosts;
  if (hosts.length !== 1 || host === undefined || host === '') {
    return { status: 400, title: 'Host missing or given twice', advice: 'A request names exactly one host.' };
  }
  if (authorities.has(host.toLowerCase())) return null;
  return {
    status: 421,
    title: 'Not a name of this page',
    advice: 'Use the address the daemon printed at its start. Through a tunnel, give both ends the same port.',
  };
}

/** An unsafe request must prove by a header no foreign page can set that it comes from this very origin. */
function refusalOfOrigin(head: RequestHead): Refusal | null {
  if (head.method !== 'POST') return null;
  const [host = ''] = valuesOf(head, 'host');
  const origins = valuesOf(head, 'origin');
  const sites = valuesOf(head, 'sec-fetch-site');
  const originProves = origins.length === 1 && origins[0]?.toLowerCase() === `http://${host.toLowerCase()}`;
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
