import { createHash, timingSafeEqual } from 'node:crypto';
import { readSecretFile } from './config/secrets.ts';
import { EXIT, OperatorError, reasonOf } from './errors.ts';
import { isLoopback } from './loopback.ts';
import type { Stage } from './progress.ts';
import { createGate, type Gate, type LoginReport } from './review/access/gate.ts';
import type { ReviewDesk } from './review/desk.ts';
import { type ReviewServer, startReviewServer } from './review/server.ts';
import type { VerdictTokens } from './review/verdictToken.ts';
import { type Loop, startLoop } from './schedule/loop.ts';
import type { Station } from './station.ts';

/** The review page while the daemon runs. A port that is taken keeps neither feeds nor mail waiting: the page comes when it is free. */
export interface ReviewPage {
  /** Null while it cannot listen. */
  url(): string | null;
  close(): Promise<void>;
}

export interface ReviewPageParts {
  readonly desk: ReviewDesk;
  readonly tokens: VerdictTokens;
  readonly stage?: Stage;
}

const RETRY_MS = 30_000;
const PROBE_MS = 60_000;
export const PAGE_LIMIT_MS = 600_000;

/** Rejects when the address can never be right; resolves, listening or not, otherwise. */
export async function openReviewPage(station: Station, { desk, tokens, stage }: ReviewPageParts): Promise<ReviewPage> {
  const { log, configuration, clock } = station;
  const settings = {
    ...configuration.review,
    desk,
    tokens,
    gate: gateOf(station),
    isMonitor: monitorCheck(configuration.review.monitorTokenFile),
    observatory: configuration.observatory.name,
    now: () => clock.now(),
    onFault: ({ id, error }: { id: string; error: unknown }) =>
      log.error({ id, err: error }, 'fault on the review page'),
  };
  let server: ReviewServer | null = null;
  let closed = false;
  let retry: NodeJS.Timeout | undefined;

  const open = async () => {
    try {
      server = await startReviewServer(settings);
      if (closed) await server.close();
      else log.info({ url: server.url }, 'review page listens');
    } catch (error) {
      if (error instanceof OperatorError && error.exitCode === EXIT.wrongUsage) throw error;
      log.error({ reason: reasonOf(error) }, 'no review page yet; trying again every 30 seconds');
      if (!closed) retry = setTimeout(() => void open(), RETRY_MS);
    }
  };
  await open();
  const probe = startProbe(station, () => server, stage);
  return {
    url: () => server?.url ?? null,
    close: async () => {
      closed = true;
      clearTimeout(retry);
      await probe.stop();
      await server?.close();
    },
  };
}

/** Makes sure that the page can still be reached. While its port is taken there is none that could fail. */
function startProbe({ log }: Station, server: () => ReviewServer | null, stage: Stage | undefined): Loop {
  return startLoop({
    name: 'page',
    pauseMs: PROBE_MS,
    log,
    async work() {
      if ((await server()?.answers()) === false) log.error('the review page does not answer');
      else stage?.step();
    },
  });
}

function gateOf({ configuration, store, clock, log }: Station): Gate {
  const { reviewers, passwordFile, host, proxy } = configuration.review;
  return createGate({
    reviewers,
    passwordFile,
    isOpenToOthers: !isLoopback(host) || proxy !== null,
    sessions: {
      put: (session) => store.putSession(session),
      find: (id) => store.session(id),
      end: (id) => store.endSession(id),
      endOlderThan: (now) => store.endSessionsOlderThan(now),
    },
    clock,
    onLogin({ outcome, reviewer, address, problem }: LoginReport) {
      const facts = { reviewer: reviewer ?? '(unknown name)', address };
      if (outcome === 'in') log.info(facts, 'reviewer logged in');
      else log.warn({ ...facts, outcome, ...(problem === undefined ? {} : { problem }) }, 'login refused');
    },
  });
}

/** `Authorization: Bearer …` (RFC 6750) with what stands in the file, which is read anew each time. */
function monitorCheck(file: string | null): (authorization: string | undefined) => boolean {
  return (authorization) => {
    const given = /^Bearer ([\x21-\x7e]{1,4096})$/i.exec(authorization ?? '')?.[1];
    if (file === null || given === undefined) return false;
    const wanted = readSecretFile(file);
    return !('problem' in wanted) && timingSafeEqual(digestOf(given), digestOf(wanted.secret.reveal()));
  };
}

function digestOf(text: string): Buffer {
  return createHash('sha256').update(text).digest();
}
