import type { Context, Hono, MiddlewareHandler } from 'hono';
import { bodyLimit } from 'hono/body-limit';
import { cookieGone, cookieWith, tokenIn } from './access/cookie.ts';
import type { Gate } from './access/gate.ts';
import type { Session } from './access/sessions.ts';
import type { Visitor } from './guard.ts';
import { plainPage } from './pages/layout.ts';
import { lateVerdictPage, loginPage, onceMorePage } from './pages/login.ts';
import { LARGEST_FORM_BYTES, readForm, readSubmittedVerdict } from './verdictForm.ts';
import type { VerdictTokens } from './verdictToken.ts';

/** Coming in and going out, and the barrier before everything else. */
export interface AccessParts {
  readonly gate: Gate;
  readonly tokens: VerdictTokens;
  readonly observatory: string;
  /** Whether an `Authorization` header is that of the monitoring system. */
  readonly isMonitor: (authorization: string | undefined) => boolean;
}

export interface ReviewEnvironment {
  readonly Bindings: { readonly visitor: Visitor };
  readonly Variables: { readonly session: Session | null };
}

export type ReviewContext = Context<ReviewEnvironment>;

const LARGEST_LOGIN_BYTES = 8 * 1024;
const ALWAYS_OPEN = /^\/(assets\/|login$)/;
/** For programs: no page that a person would be led to. */
const FOR_MACHINES = /^\/(api\/|healthz$|metrics$)/;
const FOR_MONITORS = /^\/(healthz|metrics)$/;

function visitorOf(c: ReviewContext): Visitor {
  return c.env.visitor;
}

/** Lets in who is logged in, and everybody while the page stands open; sends the others to log in. */
export function barrier({ gate, isMonitor }: AccessParts): MiddlewareHandler<ReviewEnvironment> {
  return async (c, next) => {
    const token = tokenIn(c.req.header('cookie'), visitorOf(c).secure);
    const session = token === null ? null : gate.sessionOf(token);
    c.set('session', session);
    const { path } = c.req;
    if (session !== null || ALWAYS_OPEN.test(path)) return next();
    if (!gate.isClosed()) return next();
    if (FOR_MONITORS.test(path) && isMonitor(c.req.header('authorization'))) return next();
    if (FOR_MACHINES.test(path)) return c.json({ error: 'not logged in' }, 401);
    if (c.req.method === 'POST') return lateForm(c);
    if (c.req.header('sec-fetch-site') === 'cross-site') return c.html(onceMorePage(path));
    return c.redirect(`/login?next=${encodeURIComponent(path)}`, 303);
  };
}

/** A session that ended while a note was written must not cost the note. */
async function lateForm(c: ReviewContext): Promise<Response> {
  const length = Number(c.req.header('content-length') ?? Number.POSITIVE_INFINITY);
  const event = /^(\/events\/[^/]+)\/verdict$/.exec(c.req.path)?.[1];
  const submitted =
    event !== undefined && length <= LARGEST_FORM_BYTES
      ? readSubmittedVerdict(new Uint8Array(await c.req.arrayBuffer()))
      : null;
  if (submitted === null) c.header('Connection', 'close');
  return c.html(lateVerdictPage(submitted?.draft.note ?? '', event ?? '/'), 401);
}

export function addAccessRoutes(routes: Hono<ReviewEnvironment>, parts: AccessParts): void {
  const { gate, tokens, observatory } = parts;
  const form = (
    c: ReviewContext,
    next: string,
    name = '',
    refused: string | null = null,
    status: 200 | 401 | 403 | 429 | 503 = 200,
  ) => c.html(loginPage(observatory, { token: tokens.issueFor('log in', ''), next, name, refused }), status);
  const limit = bodyLimit({
    maxSize: LARGEST_LOGIN_BYTES,
    onError: (c) => {
      c.header('Connection', 'close');
      return c.html(plainPage('Too long', ['Name and password fit into 8 kB.']), 413);
    },
  });

  routes.get('/login', (c) => {
    const next = localPath(c.req.query('next'));
    return gate.isClosed() ? form(c, next) : c.redirect(next, 303);
  });
  routes.post('/login', limit, async (c) => {
    const fields = readForm(new Uint8Array(await c.req.arrayBuffer()), ['name', 'password', 'next', 'token']);
    if (fields === null) return c.html(plainPage('Malformed form', ['The form could not be read.']), 400);
    const visitor = visitorOf(c);
    const [name = '', next] = [fields.get('name')?.trim(), localPath(fields.get('next'))];
    if (!tokens.acceptsFor(fields.get('token') ?? '', 'log in', '')) {
      return form(c, next, name, 'This form is from before the daemon was restarted. Try again.', 403);
    }
    const password = fields.get('password') ?? '';
    const earlierToken = tokenIn(c.req.header('cookie'), visitor.secure);
    const outcome = await gate.logIn({ name, password, address: visitor.address, earlierToken });
    switch (outcome.kind) {
      case 'in':
        c.header('Set-Cookie', cookieWith(outcome.token, visitor.secure));
        return c.redirect(next, 303);
      case 'wrong':
        return form(c, next, name, 'Name or password is wrong.', 401);
      case 'too often':
        c.header('Retry-After', String(outcome.waitSeconds));
        return form(c, next, name, `Too many tries. Wait ${outcome.waitSeconds} s.`, 429);
      case 'out of order':
        return form(c, next, name, 'Nobody can log in at the moment; the log of the watch says why.', 503);
    }
  });
  routes.post('/logout', limit, async (c) => {
    const fields = readForm(new Uint8Array(await c.req.arrayBuffer()), ['token']);
    const session = c.get('session');
    if (session === null || !tokens.acceptsFor(fields?.get('token') ?? '', 'log out', session.id)) {
      return c.html(plainPage('Not logged out', ['Open your account and try again.']), 403);
    }
    const { secure } = visitorOf(c);
    const token = tokenIn(c.req.header('cookie'), secure);
    if (token !== null) gate.logOut(token);
    c.header('Set-Cookie', cookieGone(secure));
    return c.redirect('/login', 303);
  });
}

/** Never leads to another site: `//host` and `/\host` would. */
function localPath(text: string | undefined): string {
  return text !== undefined && /^\/(?![/\\])[\x21-\x5b\x5d-\x7e]*$/.test(text) ? text : '/';
}
