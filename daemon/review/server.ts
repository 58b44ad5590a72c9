import { createServer, type IncomingMessage, type Server, type ServerOptions, type ServerResponse } from 'node:http';
import { createServer as createTlsServer } from 'node:https';
import type { AddressInfo } from 'node:net';
import type { Duplex } from 'node:stream';
import { getRequestListener } from '@hono/node-server';
import { type ReviewSettings, reachProblem } from '../config/reviewSettings.ts';
import { readTls, type TlsIdentity } from '../config/tlsFiles.ts';
import { EXIT, OperatorError } from '../errors.ts';
import { isLoopback } from '../loopback.ts';
import type { Gate } from './access/gate.ts';
import type { AccessParts } from './accessRoutes.ts';
import type { ReviewDesk } from './desk.ts';
import { entranceOf, ownOrigin } from './entrance.ts';
import { ALLOWED_METHODS, admit, type Entrance, type Refusal, type Visitor } from './guard.ts';
import { SECURITY_HEADERS, TLS_ONLY_HEADER } from './headers.ts';
import { plainPage } from './pages/layout.ts';
import { createReviewApp, type ReviewFault } from './routes.ts';
import { listenerAnswers } from './selfProbe.ts';
import type { VerdictTokens } from './verdictToken.ts';

/**
 * The review page's listener: on loopback in plain HTTP, beyond it with TLS or behind the named proxy. Everything that arrives is bounded in
 * time, size and number; the request head is judged before it is routed.
 */
export interface ReviewServerSettings extends Omit<ReviewSettings, 'passwordFile' | 'monitorTokenFile'> {
  /** Port 0: any free one. */
  readonly desk: ReviewDesk;
  readonly observatory: string;
  readonly gate: Gate;
  readonly tokens: VerdictTokens;
  readonly isMonitor: AccessParts['isMonitor'];
  readonly now: () => Date;
  readonly onFault?: (fault: ReviewFault) => void;
  readonly limits?: Partial<ServerLimits>;
}

export interface ServerLimits {
  readonly headersMs: number;
  readonly requestMs: number;
  readonly idleMs: number;
  /** Between two requests on one connection. */
  readonly keepAliveMs: number;
  readonly checkEveryMs: number;
  readonly connections: number;
}

export interface ReviewServer {
  /** With a closing slash: `http://127.0.0.1:8420/`. */
  readonly url: string;
  /** Whether it still does. */
  answers(): Promise<boolean>;
  /** Answers what is under way, at most `CLOSE_GRACE_MS`, then cuts. */
  close(): Promise<void>;
}

const DEFAULT_LIMITS: ServerLimits = {
  headersMs: 8_000,
  requestMs: 15_000,
  idleMs: 20_000,
  keepAliveMs: 5_000,
  checkEveryMs: 1_000,
  connections: 128,
};
const LARGEST_HEAD_BYTES = 16 * 1024;
const MOST_HEADERS = 60;
const REQUESTS_A_CONNECTION = 200;
const CLOSE_GRACE_MS = 2_000;

/** Rejects with an `OperatorError` when the page would stand open to others, its certificate cannot be used, or the port is taken. */
export async function startReviewServer(settings: ReviewServerSettings): Promise<ReviewServer> {
  const identity = safeIdentity(settings);
  const limits = { ...DEFAULT_LIMITS, ...settings.limits };
  const closing = new AbortController();
  const app = createReviewApp({ ...settings, closing: closing.signal, onFault: settings.onFault ?? (() => {}) });
  const visitors = new WeakMap<IncomingMessage, Visitor>();
  const answer = getRequestListener((request, { incoming }) =>
    app.fetch(request, { visitor: visitors.get(incoming as IncomingMessage) }),
  );
  let entrance: Entrance = { scheme: 'http', isOwnAuthority: () => false, proxy: settings.proxy };
  const onRequest = (incoming: IncomingMessage, outgoing: ServerResponse) => {
    for (const [name, value] of SECURITY_HEADERS) outgoing.setHeader(name, value);
    const admitted = admit(headOf(incoming), incoming.socket.remoteAddress ?? '', entrance);
    if ('status' in admitted) {
      refuse(outgoing, admitted);
      return;
    }
    if (admitted.secure) outgoing.setHeader(...TLS_ONLY_HEADER);
    visitors.set(incoming, admitted);
    void answer(incoming, outgoing);
  };
  const server =
    identity === null
      ? createServer(serverOptions(limits), onRequest)
      : createTlsServer({ ...serverOptions(limits), ...tlsOptions(identity, limits) }, onRequest);
  server.maxConnections = limits.connections;
  server.maxHeadersCount = MOST_HEADERS;
  server.maxRequestsPerSocket = REQUESTS_A_CONNECTION;
  server.setTimeout(limits.idleMs);
  server.on('clientError', refuseUnreadable);
  server.on('tlsClientError', (_error, socket) => socket.destroy());
  server.on('connect', (_incoming, socket) => socket.destroy());

  const port = await listen(server, settings);
  entrance = entranceOf(settings, port, identity?.certificate ?? null);
  return {
    url: `${settings.proxy?.origin ?? ownOrigin(settings.host, port, identity)}/`,
    answers: () => listenerAnswers({ host: settings.host, port, tls: identity !== null }),
    close: () => {
      closing.abort();
      return closeServer(server);
    },
  };
}

/** Null: no TLS. Throws when the page would stand open to others. */
function safeIdentity(settings: ReviewServerSettings): TlsIdentity | null {
  const { host, tls, proxy, reviewers } = settings;
  const wrong = (message: string) => new OperatorError(message, { exitCode: EXIT.wrongUsage, advice: 'see [review]' });
  const problem = reachProblem({ host, tls, proxy, addressNamed: true });
  if (problem !== null) throw wrong(`the review page will not listen: ${problem}`);
  if ((proxy !== null || !isLoopback(host)) && reviewers.length === 0)
    throw wrong('the review page will not listen: no reviewers are named who could log in');
  if (tls === null) return null;
  const identity = readTls(tls);
  if ('problem' in identity) throw wrong(`the review page will not listen: ${identity.problem}`);
  return identity;
}

function tlsOptions({ certificates, key }: TlsIdentity, limits: ServerLimits) {
  return { cert: certificates, key, minVersion: 'TLSv1.2', handshakeTimeout: limits.headersMs } as const;
}

function serverOptions(limits: ServerLimits): ServerOptions {
  return {
    headersTimeout: limits.headersMs,
    requestTimeout: limits.requestMs,
    connectionsCheckingInterval: limits.checkEveryMs,
    keepAliveTimeout: limits.keepAliveMs,
    maxHeaderSize: LARGEST_HEAD_BYTES,
    insecureHTTPParser: false,
    requireHostHeader: false, // the guard asks for it, and answers with our own page
  };
}

function headOf(incoming: IncomingMessage) {
  return { method: incoming.method ?? '', target: incoming.url ?? '', rawHeaders: incoming.rawHeaders };
}

/** The body, if one comes, is not read: the connection ends with the answer. */
function refuse(outgoing: ServerResponse, refusal: Refusal): void {
  if (refusal.status === 405) outgoing.setHeader('Allow', ALLOWED_METHODS.join(', '));
  outgoing.setHeader('Connection', 'close');
  outgoing.setHeader('Content-Type', 'text/html; charset=utf-8');
  outgoing.statusCode = refusal.status;
  outgoing.end(String(plainPage(refusal.title, [refusal.advice])));
}

/** What the HTTP parser itself refuses never becomes a request; the answer is written by hand. */
function refuseUnreadable(error: Error & { code?: string }, socket: Duplex): void {
  if (error.code === 'ECONNRESET' || !socket.writable) {
    socket.destroy();
    return;
  }
  const status = statusOf(error.code);
  const headers = SECURITY_HEADERS.map(([name, value]) => `${name}: ${value}\r\n`).join('');
  socket.end(`HTTP/1.1 ${status}\r\n${headers}Connection: close\r\nContent-Length: 0\r\n\r\n`, () => socket.destroy());
}

function statusOf(code: string | undefined): string {
  if (code === 'HPE_HEADER_OVERFLOW') return '431 Request Header Fields Too Large';
  if (code === 'ERR_HTTP_REQUEST_TIMEOUT') return '408 Request Timeout';
  return '400 Bad Request';
}

async function listen(server: Server, { host, port, tls, proxy }: ReviewServerSettings): Promise<number> {
  await new Promise<void>((resolve, reject) => {
    server.once('error', (error: NodeJS.ErrnoException) => {
      const taken = error.code === 'EADDRINUSE';
      reject(
        new OperatorError(
          `the review page cannot listen on ${host}:${port}: ${taken ? 'the port is in use' : error.message}`,
          {
            exitCode: EXIT.workFailed,
            advice: taken ? 'end the other program or set another port in [review] listen' : 'check [review] listen',
            cause: error,
          },
        ),
      );
    });
    server.listen({ host, port }, resolve);
  });
  const { address, port: bound } = server.address() as AddressInfo;
  if (!isLoopback(address) && tls === null && proxy === null) {
    server.close();
    throw new OperatorError(`the review page will not listen on ${address}: ${host} is not a loopback address here`, {
      exitCode: EXIT.wrongUsage,
      advice: 'set [review] listen to 127.0.0.1:PORT',
    });
  }
  return bound;
}

async function closeServer(server: Server): Promise<void> {
  const closed = new Promise<void>((resolve) => {
    server.close(() => resolve());
  });
  server.closeIdleConnections();
  const cut = setTimeout(() => server.closeAllConnections(), CLOSE_GRACE_MS);
  await closed;
  clearTimeout(cut);
}
