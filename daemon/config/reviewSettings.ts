import { isIP } from 'node:net';
import { join } from 'node:path';
import { isLoopback } from '../loopback.ts';
import { parseListen } from './listenAddress.ts';
import type { Surroundings } from './mailSettings.ts';
import { readPrivateFile } from './secrets.ts';
import type { SectionReader } from './sectionReader.ts';
import { reviewTable } from './sections.ts';
import { readTls, type TlsFiles } from './tlsFiles.ts';

/** Where the review page listens, who may come in, and by which way. */
export interface ReviewSettings {
  readonly host: string;
  readonly port: number;
  /** Who may sign; empty: any name. */
  readonly reviewers: readonly string[];
  /** Their passwords, hashed. */
  readonly passwordFile: string;
  readonly tls: TlsFiles | null;
  readonly proxy: NamedProxy | null;
  /** What a monitoring system shows instead of logging in; null: it cannot, unless it asks on loopback. */
  readonly monitorTokenFile: string | null;
}

/** The one proxy whose word about a request is believed. */
export interface NamedProxy {
  /** As browsers reach it: `https://watch.example.org`. */
  readonly origin: string;
  readonly addresses: readonly string[];
}

type ReviewTable = (typeof reviewTable)['_output'];

const PASSWORD_FILE = 'reviewers.json';
const LONGEST_TOKEN_BYTES = 4096;

/** @param stateFolder null after a complaint about it */
export function readReview(
  reader: SectionReader,
  around: Surroundings,
  stateFolder: string | null,
): ReviewSettings | null {
  const table = reader.has(['review']) ? reader.read(['review'], reviewTable) : reviewTable.parse({});
  if (table === null) return null;
  const twice = table.reviewers.findIndex((name, index) => table.reviewers.indexOf(name) < index);
  if (twice >= 0) reader.error(['review', 'reviewers', twice], `"${table.reviewers[twice]}" stands there twice`);
  const address = parseListen(table.listen);
  if ('problem' in address) reader.error(['review', 'listen'], address.problem);
  const tls = tlsFiles(reader, table, around);
  const proxy = namedProxy(reader, table);
  const monitorTokenFile = monitorToken(reader, table, around);
  if ('problem' in address || tls === 'unsound' || proxy === 'unsound') return null;
  const problem = reachProblem({ ...address, tls, proxy, addressNamed: table.proxy_address !== undefined });
  if (problem !== null) reader.error(['review', 'listen'], problem);
  const isOpenToOthers = !isLoopback(address.host) || proxy !== null;
  if (isOpenToOthers && table.reviewers.length === 0) {
    reader.error(
      ['review'],
      'names no reviewers; beyond this machine only reviewers who log in may look: reviewers = ["…"]',
    );
  }
  const passwordFile =
    table.password_file === undefined ? join(stateFolder ?? '', PASSWORD_FILE) : around.absolute(table.password_file);
  return { ...address, reviewers: table.reviewers, passwordFile, tls, proxy, monitorTokenFile };
}

/** Why a page on this address would stand open to others; null: it does not. */
export function reachProblem(door: {
  readonly host: string;
  readonly tls: unknown;
  readonly proxy: unknown;
  readonly addressNamed: boolean;
}): string | null {
  if (isLoopback(door.host) || door.tls !== null || (door.proxy !== null && door.addressNamed)) return null;
  return `${door.host} can be reached from other machines: give tls_certificate_file and tls_key_file, or behind_proxy with proxy_address, or listen on 127.0.0.1 and come through an SSH tunnel`;
}

function tlsFiles(reader: SectionReader, table: ReviewTable, around: Surroundings): TlsFiles | null | 'unsound' {
  const { tls_certificate_file: certificate, tls_key_file: key } = table;
  if (certificate === undefined && key === undefined) return null;
  if (certificate === undefined || key === undefined) {
    const missing = certificate === undefined ? 'tls_certificate_file' : 'tls_key_file';
    reader.error(['review', missing], 'is missing: certificate and key go together');
    return 'unsound';
  }
  const files = { certificateFile: around.absolute(certificate), keyFile: around.absolute(key) };
  const identity = readTls(files);
  if (!('problem' in identity)) return files;
  const at = identity.which === 'keyFile' ? 'tls_key_file' : 'tls_certificate_file';
  reader.error(['review', at], identity.problem);
  return 'unsound';
}

function namedProxy(reader: SectionReader, table: ReviewTable): NamedProxy | null | 'unsound' {
  const { behind_proxy: origin, proxy_address: addresses } = table;
  if (origin === undefined) {
    if (addresses === undefined) return null;
    reader.error(['review', 'proxy_address'], 'belongs to behind_proxy, which is missing');
    return 'unsound';
  }
  const wrong = (addresses ?? []).findIndex((address) => isIP(address) === 0);
  if (wrong < 0) return { origin, addresses: addresses ?? ['127.0.0.1', '::1'] };
  reader.error(['review', 'proxy_address', wrong], `"${addresses?.[wrong]}" is not an IP address`);
  return 'unsound';
}

function monitorToken(reader: SectionReader, table: ReviewTable, around: Surroundings): string | null {
  if (table.monitor_token_file === undefined) return null;
  const file = around.absolute(table.monitor_token_file);
  const read = readPrivateFile(file, LONGEST_TOKEN_BYTES);
  if ('problem' in read) reader.error(['review', 'monitor_token_file'], read.problem);
  return file;
}
