import { createServer, type IncomingMessage, type Server, type ServerOptions, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';
import type { Duplex } from 'node:stream';
import { getRequestListener } from '@hono/node-server';
import { EXIT, OperatorError } from '../errors.ts';
import type { ReviewDesk } from './desk.ts';
import { ALLOWED_METHODS, authoritiesOf, isLoopback, type Refusal, refusalOf } from './guard.ts';
import { SECURITY_HEADERS } from './headers.ts';
import { plainPage } from './pages/layout.ts';
import { createReviewApp, type ReviewFault } from './routes.ts';
import { createVerdictTokens } from './verdictToken.ts';

/**
 * The review page's listener. It has no login, so it listens on loopback only: whoever reaches it has an account on this
 * machine or a tunnel to it. Everything that arrives is bounded in time, size and number; the request head is judged
 * before it is routed.
 */
export interface ReviewSettings {
  readonly host: string;
  /** 0: any free port. */
  readonly port: number;
  readonly desk: ReviewDesk;
  readonly observatory: string;
  readonly reviewers: readonly string[];
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

/** Rejects with an `OperatorError` when the host is not loopback or the port is taken. */
export async function startReviewServer(settings: ReviewSettings): Promise<ReviewServer> {
  if (!isLoopback(settings.host)) {
    throw new OperatorError(`the review page will not listen on ${settings.host}: it has no login`, {
      exitCode: EXIT.wrongUsage,
      advice: 'set [review] listen to 127.0.0.1:PORT and reach it from elsewhere through an SSH tunnel',
    });
  }
  const limits = { ...DEFAULT_LIMITS, ...settings.limits };
  const app = createReviewApp({
    ...settings,
    tokens: createVerdictTokens(),
    onFault: settings.onFault ?? (() => {}),
  });
  const answer = getRequestListener(app.fetch);
  let authorities: ReadonlySet<string> = new Set();
  const server = createServer(serverOptions(limits), (incoming, outgoing) => {
    for (const [name, value] of SECURITY_HEADERS) outgoing.setHeader(name, value);
    const refusal = refusalOf(headOf(incoming), authorities);
    if (refusal === null) void answer(incoming, outgoing);
    else refuse(outgoing, refusal);
  });
  server.maxConnections = limits.connections;
  server.maxHeadersCount = MOST_HEADERS;
  server.maxRequestsPerSocket = REQUESTS_A_CONNECTION;
  server.setTimeout(limits.idleMs);
  server.on('clientError', refuseUnreadable);
  server.on('connect', (_incoming, socket) => socket.destroy());

  const port = await listen(server, settings);
  authorities = authoritiesOf(settings.host, port);
  const name = settings.host.includes(':') ? `[${settings.host}]` : settings.host;
  return { url: `http://${name}:${port}/`, close: () => closeServer(server) };
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

async function listen(server: Server, { host, port }: ReviewSettings): Promise<number> {
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
  if (!isLoopback(address)) {
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
