import type { X509Certificate } from 'node:crypto';
import { isIP } from 'node:net';
import type { NamedProxy } from '../config/reviewSettings.ts';
import type { TlsIdentity } from '../config/tlsFiles.ts';
import { isLoopback } from '../loopback.ts';
import { authoritiesOf, type Entrance } from './guard.ts';

/** Under which names a listener answers: in plain HTTP its own, with TLS those that its certificate names. */
export function entranceOf(
  { host, proxy }: { readonly host: string; readonly proxy: NamedProxy | null },
  port: number,
  certificate: X509Certificate | null,
): Entrance {
  const own = authoritiesOf(host, port);
  if (certificate === null) return { scheme: 'http', isOwnAuthority: (authority) => own.has(authority), proxy };
  const isOwnAuthority = (authority: string) => own.has(authority) || isCertified(authority, port, certificate);
  return { scheme: 'https', isOwnAuthority, proxy };
}

const TLS_PORT = 443;

function isCertified(authority: string, port: number, certificate: X509Certificate): boolean {
  const match = /^(?:\[([0-9a-f:]+)\]|([a-z0-9_.-]+))(?::([0-9]{1,5}))?$/.exec(authority);
  if (match === null || Number(match[3] ?? TLS_PORT) !== port) return false;
  const name = match[1] ?? match[2] ?? '';
  return (isIP(name) === 0 ? certificate.checkHost(name) : certificate.checkIP(name)) !== undefined;
}

/** For links and for the person who starts the daemon: an address under which the page answers, and its certificate is good. */
export function ownOrigin(host: string, port: number, identity: TlsIdentity | null): string {
  if (identity === null) return `http://${bracketed(host)}:${port}`;
  const name = isLoopback(host) ? host : (firstName(identity.certificate) ?? host);
  return `https://${bracketed(name)}${port === TLS_PORT ? '' : `:${port}`}`;
}

function firstName({ subjectAltName }: X509Certificate): string | null {
  return /(?:^|, )DNS:([a-z0-9_.-]+)(?:,|$)/i.exec(subjectAltName ?? '')?.[1] ?? null;
}

function bracketed(host: string): string {
  return host.includes(':') ? `[${host}]` : host;
}
