import { isIPv4 } from 'node:net';

/** Names and addresses that reach this machine alone. */
export function isLoopback(host: string): boolean {
  return host === 'localhost' || host === '::1' || (isIPv4(host) && host.startsWith('127.'));
}
