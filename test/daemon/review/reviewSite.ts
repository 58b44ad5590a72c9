import { afterEach } from 'vitest';
import type { Gate } from '../../../daemon/review/access/gate.ts';
import type { ReviewDesk } from '../../../daemon/review/desk.ts';
import { type ReviewServer, type ReviewServerSettings, startReviewServer } from '../../../daemon/review/server.ts';
import { createVerdictTokens } from '../../../daemon/review/verdictToken.ts';
import { memoryDesk, NOW } from '../../support/reviewDesk.ts';

const open: ReviewServer[] = [];

afterEach(async () => {
  await Promise.all(open.splice(0).map((server) => server.close()));
});

/** Nobody needs to log in. */
const OPEN_GATE: Gate = {
  isClosed: () => false,
  logIn: async () => ({ kind: 'wrong' }),
  sessionOf: () => null,
  logOut: () => {},
};

export function siteSettings(
  change: Partial<ReviewServerSettings> & Pick<ReviewServerSettings, 'desk'>,
): ReviewServerSettings {
  return {
    host: '127.0.0.1',
    port: 0,
    observatory: 'Kestrel Ridge',
    reviewers: [],
    tls: null,
    proxy: null,
    gate: OPEN_GATE,
    tokens: createVerdictTokens(),
    isMonitor: () => false,
    now: () => NOW,
    ...change,
  };
}

/** A page on a free loopback port, closed after the test. */
export async function startSite<Desk extends ReviewDesk>(
  change: Partial<Omit<ReviewServerSettings, 'desk'>> & { readonly desk: Desk },
): Promise<{ readonly url: string; readonly desk: Desk }> {
  const server = await startReviewServer(siteSettings(change));
  open.push(server);
  return { url: server.url, desk: change.desk };
}

/** The same over a desk in memory with one candidate on it. */
export function startSampleSite(change: Partial<Omit<ReviewServerSettings, 'desk'>> = {}) {
  return startSite({ ...change, desk: memoryDesk() });
}

export interface VerdictFields {
  readonly verdict?: string;
  readonly by?: string;
  readonly note?: string;
  readonly token?: string;
  readonly revision?: string;
}

/** What the form of an event's page carries: its hidden fields and a filled-in verdict. */
export async function fillForm(
  url: string,
  id = 'kr-0417-61370',
  change: VerdictFields = {},
): Promise<Record<string, string> & { readonly token: string }> {
  const page = await (await fetch(`${url}events/${encodeURIComponent(id)}`)).text();
  const hidden = (name: string) => new RegExp(`name="${name}" value="([^"]*)"`).exec(page)?.[1] ?? '';
  return {
    token: hidden('token'),
    revision: hidden('revision'),
    verdict: 'accept',
    by: 'duty',
    note: 'Both receivers show it.',
    ...change,
  };
}

/** Posts as a browser on the page does; `headers` replace or add. */
export function postVerdict(
  url: string,
  fields: Record<string, string> | string,
  headers: Record<string, string> = {},
  id = 'kr-0417-61370',
): Promise<Response> {
  return fetch(`${url}events/${encodeURIComponent(id)}/verdict`, {
    method: 'POST',
    redirect: 'manual',
    headers: { Origin: url.slice(0, -1), 'Content-Type': 'application/x-www-form-urlencoded', ...headers },
    body: typeof fields === 'string' ? fields : new URLSearchParams(fields).toString(),
  });
}
