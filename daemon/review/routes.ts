import { randomUUID } from 'node:crypto';
import { Hono } from 'hono';
import { bodyLimit } from 'hono/body-limit';
import { eventJson, eventsCsv } from '../../alerts/index.ts';
import type { EventRecord } from '../records.ts';
import type { Session } from './access/sessions.ts';
import {
  type AccessParts,
  addAccessRoutes,
  barrier,
  type ReviewContext as Context,
  type ReviewEnvironment,
} from './accessRoutes.ts';
import { createChanges } from './changes.ts';
import type { ReviewDesk } from './desk.ts';
import { MARK } from './looks/mark.ts';
import { SCRIPT } from './looks/script.ts';
import { STYLE } from './looks/style.ts';
import { THEME_SCRIPT } from './looks/themeScript.ts';
import { type EventContent, eventPage } from './pages/event.ts';
import { healthPage } from './pages/health.ts';
import { type Frame, type Html, type PageContent, page, plainPage, type Section } from './pages/layout.ts';
import { accountPage } from './pages/login.ts';
import { type FeedsContent, feedsPage, mailPage } from './pages/overviews.ts';
import { pulsarQuery, pulsarsPage } from './pages/pulsars.ts';
import { type TonightContent, tonightPage } from './pages/tonight.ts';
import type { RefusedVerdict } from './pages/verdict.ts';
import { eventPath, subjectOf } from './pages/wording.ts';
import { complaintAbout, LARGEST_FORM_BYTES, readSubmittedVerdict, type SubmittedVerdict } from './verdictForm.ts';

export interface ReviewApp extends AccessParts {
  readonly desk: ReviewDesk;
  /** Empty: any name may sign. */
  readonly reviewers: readonly string[];
  readonly now: () => Date;
  /** Told of every fault; the visitor sees only its id. */
  readonly onFault: (fault: ReviewFault) => void;
  /** Ends what would otherwise go on: the streams of news to open pages. */
  readonly closing?: AbortSignal;
}

export interface ReviewFault {
  readonly id: string;
  readonly error: unknown;
}

/** OpenMetrics 1.0, “Content-Type”. */
const OPEN_METRICS_TYPE = 'application/openmetrics-text; version=1.0.0; charset=utf-8';
const SCRIPT_TYPE = 'text/javascript; charset=utf-8';
const LONGEST_LIST = 200;
const RECENT_DECISIONS = 20;

/** The closed list of what the page answers. Nothing is read from disk; what is not listed is 404. */
export function createReviewApp(app: ReviewApp): Hono<ReviewEnvironment> {
  const { desk } = app;
  const frame = (c: Context): Frame => ({
    observatory: app.observatory,
    now: app.now(),
    version: desk.version(),
    health: desk.health(),
    reviewer: c.get('session')?.reviewer ?? null,
  });
  const show: Show = (c, contentOf, status = 200) => {
    // The version is read before the content: what changes in between is then noticed by the page's next look.
    const around = frame(c);
    const content = contentOf();
    return content === null ? unknownEvent(c) : c.html(page(around, content), status);
  };

  const routes = new Hono<ReviewEnvironment>();
  routes.use(barrier(app));
  const sections: readonly (readonly [path: string, name: Section, main: (c: Context) => Html])[] = [
    ['/', 'Tonight', () => tonightPage(tonightOf(desk))],
    ['/pulsars', 'Pulsars', (c) => pulsarsPage(desk.pulsars(), pulsarQuery(c.req.query()))],
    ['/feeds', 'Feeds', () => feedsPage(feedsOf(desk))],
    ['/mail', 'Mail', () => mailPage(desk.outbox(LONGEST_LIST), LONGEST_LIST)],
    ['/health', 'Health', () => healthPage(desk.vitalSigns(), app.now())],
  ];
  for (const [path, name, main] of sections) {
    routes.get(path, (c) => show(c, () => ({ title: name, section: name, main: main(c) })));
  }
  addEventRoutes(routes, app, show);
  addMachineRoutes(routes, app);
  addAccessRoutes(routes, app);
  routes.get('/account', (c) => {
    const session = c.get('session');
    if (session === null) return c.redirect('/login', 303);
    const token = app.tokens.issueFor('log out', session.id);
    return show(c, () => ({ title: 'Account', section: null, main: accountPage(session.reviewer, token) }));
  });

  routes.get('/assets/review.css', (c) => c.body(STYLE, 200, { 'Content-Type': 'text/css; charset=utf-8' }));
  routes.get('/assets/review.js', (c) => c.body(SCRIPT, 200, { 'Content-Type': SCRIPT_TYPE }));
  routes.get('/assets/theme.js', (c) => c.body(THEME_SCRIPT, 200, { 'Content-Type': SCRIPT_TYPE }));
  routes.get('/assets/mark.svg', (c) => c.body(MARK, 200, { 'Content-Type': 'image/svg+xml' }));

  routes.notFound((c) => c.html(plainPage('Nothing here', ['This page has no such address.']), 404));
  routes.onError((error, c) => {
    // A visitor who hung up is no fault of ours.
    if (c.req.raw.signal.aborted) return c.body(null, 400);
    const id = randomUUID().slice(0, 8);
    app.onFault({ id, error });
    const lines = ['The page failed; the watch itself goes on.', `The log has the details under ${id}.`];
    return c.html(plainPage('Something went wrong', lines), 500);
  });
  return routes;
}

function tonightOf(desk: ReviewDesk): TonightContent {
  const decisions = desk.decisions(RECENT_DECISIONS);
  return { morning: desk.morning(), decisions, pulsars: desk.pulsars(), health: desk.health() };
}

function feedsOf(desk: ReviewDesk): FeedsContent {
  const lists = { quarantine: desk.quarantine(LONGEST_LIST), files: desk.files(LONGEST_LIST) };
  return { feeds: desk.feeds(), ...lists, most: LONGEST_LIST };
}

/** With its neighbours in the queue; one that is not in the queue leads to the head of it. */
function contentOf(desk: ReviewDesk, record: EventRecord): EventContent {
  const { waiting, suspected } = desk.morning();
  const queue = [...waiting, ...suspected];
  const at = queue.findIndex(({ id }) => id === record.event.id);
  const neighbours = { previous: at < 0 ? null : (queue[at - 1] ?? null), next: queue[at + 1] ?? null };
  return { record, origins: desk.origins(record), plan: desk.plan(record), neighbours };
}

type Show = (
  c: Context,
  contentOf: () => PageContent | null,
  status?: 200 | 403 | 409 | 422,
) => Response | Promise<Response>;

function unknownEvent(c: Context): Response | Promise<Response> {
  return c.html(plainPage('No such event', ['No event on record has this id.']), 404);
}

function addEventRoutes(routes: Hono<ReviewEnvironment>, app: ReviewApp, show: Show): void {
  const { desk } = app;
  const showEvent = (c: Context, id: string, refused: RefusedVerdict | null, status: 200 | 403 | 409 | 422) =>
    show(
      c,
      () => {
        const record = desk.event(id);
        if (record === null) return null;
        const session = c.get('session');
        const token = app.tokens.issue(record.event.id, record.revision, session?.id);
        const form = { token, reviewers: app.reviewers, signer: session?.reviewer ?? null, refused };
        const main = eventPage(contentOf(desk, record), form);
        return { title: subjectOf(record.event), section: null, main };
      },
      status,
    );

  routes.get('/events/:id', (c) => {
    const id = c.req.param('id');
    const current = desk.event(id)?.event.id ?? id;
    return current === id ? showEvent(c, id, null, 200) : c.redirect(eventPath(current), 302);
  });
  routes.get('/events/:id/event.json', (c) => {
    const record = desk.event(c.req.param('id'));
    return record === null ? unknownEvent(c) : download(c, eventJson(record.event), 'application/json', 'event.json');
  });
  routes.get('/events/:id/event.csv', (c) => {
    const record = desk.event(c.req.param('id'));
    return record === null
      ? unknownEvent(c)
      : download(c, eventsCsv([record.event]), 'text/csv; charset=utf-8', 'event.csv');
  });
  routes.get('/events/:id/notice.xml', (c) => {
    const notice = desk.notice(c.req.param('id'), app.now());
    return notice === null ? unknownEvent(c) : download(c, notice, 'application/xml', 'notice.xml');
  });

  const limit = bodyLimit({
    maxSize: LARGEST_FORM_BYTES,
    onError: (c) => {
      c.header('Connection', 'close');
      return c.html(plainPage('Too long', ['A verdict fits into 64 kB. Nothing was changed.']), 413);
    },
  });
  routes.post('/events/:id/verdict', limit, async (c) => {
    const id = c.req.param('id');
    if (!isPlainForm(c.req.header('content-type'), c.req.header('content-encoding'))) {
      return c.html(plainPage('Not a form', ['A verdict is an ordinary form. Nothing was changed.']), 415);
    }
    const submitted = readSubmittedVerdict(new Uint8Array(await c.req.arrayBuffer()));
    if (submitted === null) {
      return c.html(plainPage('Malformed form', ['The form could not be read. Nothing was changed.']), 400);
    }
    const refusal = signVerdict(app, id, submitted, c.get('session'));
    if (refusal === 'signed') return c.redirect(eventPath(id), 303);
    return showEvent(c, id, refusal.refused, refusal.status);
  });
}

interface VerdictRefusal {
  readonly status: 403 | 409 | 422;
  readonly refused: RefusedVerdict;
}

function signVerdict(
  app: ReviewApp,
  eventId: string,
  submitted: SubmittedVerdict,
  session: Session | null,
): 'signed' | VerdictRefusal {
  const { revision } = submitted;
  // Whoever is logged in signs with no other name.
  const draft = session === null ? submitted.draft : { ...submitted.draft, by: session.reviewer };
  const refuse = (status: VerdictRefusal['status'], reason: string, judgedRevision: number | null = null) => ({
    status,
    refused: { reason, draft, judgedRevision },
  });
  if (!app.tokens.accepts(submitted.token, eventId, revision, session?.id)) {
    return refuse(
      403,
      'This form is from before the daemon was restarted, or not from this page. Check it and sign again.',
    );
  }
  const complaint = complaintAbout(draft, app.reviewers);
  if (complaint !== null || draft.verdict === null) return refuse(422, complaint ?? '');
  const outcome = app.desk.recordVerdict({
    eventId,
    expectedRevision: revision,
    verdict: draft.verdict,
    by: draft.by,
    note: draft.note,
    at: app.now().toISOString(),
  });
  // Of an event that is gone, the redirect tells the truth: there is none.
  return outcome.kind === 'conflict' ? refuse(409, outcome.message, revision) : 'signed';
}

function addMachineRoutes(routes: Hono<ReviewEnvironment>, { desk, closing }: ReviewApp): void {
  const changes = createChanges(desk, closing === undefined ? {} : { closing });
  routes.get('/api/version', (c) => c.json({ version: desk.version() }));
  routes.get('/api/changes', (c) => {
    const headers = { 'Content-Type': 'text/event-stream', 'X-Accel-Buffering': 'no' };
    if (c.req.method === 'HEAD') return c.body(null, 200, headers);
    const stream = changes.stream();
    if (stream !== null) return c.body(stream, 200, headers);
    return c.json({ error: 'too many pages are open; ask /api/version' }, 503, { 'Retry-After': '60' });
  });
  routes.get('/api/events', (c) => c.json(desk.events().map((entry) => entry.event)));
  routes.get('/api/events/:id', (c) => {
    const record = desk.event(c.req.param('id'));
    return record === null ? c.json({ error: 'no such event' }, 404) : c.json(record);
  });
  routes.get('/metrics', (c) => c.body(desk.metrics(), 200, { 'Content-Type': OPEN_METRICS_TYPE }));
  routes.get('/healthz', (c) => {
    const health = desk.health();
    return c.json({ status: health.ok ? 'ok' : 'degraded', problems: health.problems }, health.ok ? 200 : 503);
  });
}

function isPlainForm(contentType: string | undefined, encoding: string | undefined): boolean {
  const [kind = ''] = (contentType ?? '').split(';', 1);
  return kind.trim().toLowerCase() === 'application/x-www-form-urlencoded' && encoding === undefined;
}

function download(c: Context, text: string, type: string, name: string): Response {
  return c.body(text, 200, { 'Content-Type': type, 'Content-Disposition': `attachment; filename="${name}"` });
}
