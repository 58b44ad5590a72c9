import { describe, expect, test } from 'vitest';
import type { Gate } from '../../../daemon/review/access/gate.ts';
import { memoryDesk } from '../../support/reviewDesk.ts';
import { postVerdict, startSampleSite, startSite } from './reviewSite.ts';

// Over the real listener, with a gate in memory: its own rules are in access/gate.test.ts.

const ID = 'kr-0417-61370';

function memoryGate(): Gate & { readonly open: Map<string, string> } {
  const open = new Map<string, string>();
  return {
    open,
    isClosed: () => true,
    async logIn({ name, password, earlierToken }) {
      if (password === 'again and again') return { kind: 'too often', waitSeconds: 30 };
      if (password !== 'right') return { kind: 'wrong' };
      if (earlierToken !== null) open.delete(earlierToken);
      const token = `token-${name}-${open.size}`;
      open.set(token, name);
      return { kind: 'in', token };
    },
    sessionOf(token) {
      const reviewer = open.get(token);
      return reviewer === undefined ? null : { id: `id of ${token}`, reviewer };
    },
    logOut: (token) => void open.delete(token),
  };
}

const hidden = (page: string, name: string) => new RegExp(`name="${name}" value="([^"]*)"`).exec(page)?.[1] ?? '';

async function post(url: string, path: string, fields: Record<string, string>, headers: Record<string, string> = {}) {
  return fetch(`${url}${path}`, {
    method: 'POST',
    redirect: 'manual',
    headers: { Origin: url.slice(0, -1), 'Content-Type': 'application/x-www-form-urlencoded', ...headers },
    body: new URLSearchParams(fields),
  });
}

/** The cookie that a login gives, as it is sent back. */
async function logIn(url: string, name = 'duty', headers: Record<string, string> = {}): Promise<string> {
  const token = hidden(await (await fetch(`${url}login`)).text(), 'token');
  const answer = await post(url, 'login', { name, password: 'right', next: '/', token }, headers);
  expect(answer.status).toBe(303);
  return answer.headers.get('set-cookie')?.split(';')[0] ?? '';
}

async function closedSite() {
  const gate = memoryGate();
  return { ...(await startSampleSite({ gate, reviewers: ['duty', 'timing'] })), gate };
}

describe('who is not logged in', () => {
  const SHUT = ['', 'pulsars', 'feeds', 'mail', 'health', 'account', `events/${ID}`, `events/${ID}/event.csv`, 'none'];

  test.each(SHUT)('is led from /%s to the login, and back afterwards', async (path) => {
    const { url } = await closedSite();
    const answer = await fetch(`${url}${path}`, { redirect: 'manual' });
    expect([answer.status, answer.headers.get('location')]).toEqual([
      303,
      `/login?next=${encodeURIComponent(`/${path}`)}`,
    ]);
    expect(await answer.text()).not.toContain('KR 0417');
    const form = await (await fetch(new URL(answer.headers.get('location') ?? '', url))).text();
    expect(hidden(form, 'next')).toBe(`/${path}`);
  });

  test.each(['api/events', 'api/version', `api/events/${ID}`, 'healthz', 'metrics'])(
    'gets 401 from /%s',
    async (path) => {
      const { url } = await closedSite();
      const answer = await fetch(`${url}${path}`);
      expect([answer.status, await answer.json()]).toEqual([401, { error: 'not logged in' }]);
    },
  );

  test('a monitoring system shows its token, and sees nothing else', async () => {
    const isMonitor = (authorization: string | undefined) => authorization === 'Bearer for monitoring';
    const { url } = await startSampleSite({ gate: memoryGate(), isMonitor });
    const headers = { Authorization: 'Bearer for monitoring' };
    const metrics = await fetch(`${url}metrics`, { headers });
    expect([metrics.status, metrics.headers.get('content-type')]).toEqual([
      200,
      'application/openmetrics-text; version=1.0.0; charset=utf-8',
    ]);
    expect((await fetch(`${url}healthz`, { headers })).status).toBe(200);
    expect((await fetch(`${url}api/events`, { headers })).status).toBe(401);
    expect((await fetch(`${url}mail`, { headers, redirect: 'manual' })).status).toBe(303);
  });

  test('a verdict that comes too late is not recorded, and the note is handed back', async () => {
    const { url, desk, gate } = await closedSite();
    const cookie = await logIn(url);
    const page = await (await fetch(`${url}events/${ID}`, { headers: { Cookie: cookie } })).text();
    const fields = { verdict: 'accept', note: 'Seen at <two> dishes.', revision: '2', token: hidden(page, 'token') };
    gate.open.clear();
    const answer = await postVerdict(url, fields, { Cookie: cookie });
    expect([answer.status, desk.verdictCount()]).toEqual([401, 0]);
    expect(await answer.text()).toContain('Seen at &lt;two&gt; dishes.');
  });

  test('a link on another site leads in: the page is asked for once more from here', async () => {
    const { url } = await closedSite();
    const headers = { 'Sec-Fetch-Site': 'cross-site' };
    const answer = await fetch(`${url}events/${ID}`, { headers, redirect: 'manual' });
    expect(answer.status).toBe(200);
    expect(await answer.text()).toContain(`<meta http-equiv="refresh" content="0; url=/events/${ID}">`);
  });
});

describe('a reviewer who is logged in', () => {
  test('signs with the own name, whatever the form says', async () => {
    const { url, desk } = await closedSite();
    const cookie = await logIn(url, 'timing');
    const page = await (await fetch(`${url}events/${ID}`, { headers: { Cookie: cookie } })).text();
    expect(page).toContain('<bdi>timing</bdi>');
    expect(page).not.toContain('name="by"');
    const fields = { verdict: 'accept', by: 'duty', note: '', revision: '2', token: hidden(page, 'token') };
    expect((await postVerdict(url, fields, { Cookie: cookie })).status).toBe(303);
    expect(desk.event(ID)?.verdicts).toMatchObject([{ by: 'timing', verdict: 'accept' }]);
  });

  test('E11: two at once: one verdict stands, the other sees both views', async () => {
    const { url, desk } = await closedSite();
    const cookies = [await logIn(url, 'duty'), await logIn(url, 'timing')];
    const pages = await Promise.all(
      cookies.map(async (cookie) => (await fetch(`${url}events/${ID}`, { headers: { Cookie: cookie } })).text()),
    );
    const answers = await Promise.all(
      cookies.map((cookie, i) => {
        const fields = { verdict: i === 0 ? 'accept' : 'reject', note: 'mine', revision: '2' };
        return postVerdict(url, { ...fields, token: hidden(pages[i] ?? '', 'token') }, { Cookie: cookie });
      }),
    );
    expect(answers.map(({ status }) => status).sort()).toEqual([303, 409]);
    expect(desk.verdictCount()).toBe(1);
    const lost = await answers.find(({ status }) => status === 409)?.text();
    expect(lost).toContain('What you judged, revision 2');
    expect(lost).toContain('What stands now, revision 3');
  });

  test('logs out, and the token opens nothing any more', async () => {
    const { url } = await closedSite();
    const cookie = await logIn(url);
    const account = await (await fetch(`${url}account`, { headers: { Cookie: cookie } })).text();
    const out = await post(url, 'logout', { token: hidden(account, 'token') }, { Cookie: cookie });
    expect([out.status, out.headers.get('location')]).toEqual([303, '/login']);
    expect(out.headers.get('set-cookie')).toContain('Max-Age=0');
    expect((await fetch(url, { headers: { Cookie: cookie }, redirect: 'manual' })).status).toBe(303);
  });
});

describe('E2: forms of the login', () => {
  test('a login from elsewhere, or without our token, is none', async () => {
    const { url, gate } = await closedSite();
    const token = hidden(await (await fetch(`${url}login`)).text(), 'token');
    const fields = { name: 'duty', password: 'right', next: '/', token };
    expect((await post(url, 'login', fields, { Origin: 'http://evil.test' })).status).toBe(403);
    expect((await post(url, 'login', { ...fields, token: 'x' })).status).toBe(403);
    expect(gate.open.size).toBe(0);
  });

  test('a logout from elsewhere, or with the token of another session, is none', async () => {
    const { url, gate } = await closedSite();
    const [mine, other] = [await logIn(url, 'duty'), await logIn(url, 'timing')];
    const account = await (await fetch(`${url}account`, { headers: { Cookie: other } })).text();
    const fields = { token: hidden(account, 'token') };
    expect((await post(url, 'logout', fields, { Cookie: mine })).status).toBe(403);
    expect((await post(url, 'logout', fields, { Cookie: other, Origin: 'http://evil.test' })).status).toBe(403);
    expect(gate.open.size).toBe(2);
  });

  test('a verdict with the token of another session is refused', async () => {
    const { url, desk } = await closedSite();
    const [mine, other] = [await logIn(url, 'duty'), await logIn(url, 'timing')];
    const page = await (await fetch(`${url}events/${ID}`, { headers: { Cookie: other } })).text();
    const fields = { verdict: 'accept', note: '', revision: '2', token: hidden(page, 'token') };
    expect((await postVerdict(url, fields, { Cookie: mine })).status).toBe(403);
    expect(desk.verdictCount()).toBe(0);
  });

  test.each(['//evil.test', '/\\evil.test', 'https://evil.test', 'javascript:alert(1)', '/a\r\nSet-Cookie: x=1', ''])(
    'afterwards nobody is led to “%s”',
    async (next) => {
      const { url } = await closedSite();
      const token = hidden(await (await fetch(`${url}login`)).text(), 'token');
      const answer = await post(url, 'login', { name: 'duty', password: 'right', next, token });
      expect([answer.status, answer.headers.get('location')]).toEqual([303, '/']);
    },
  );
});

describe('E7: a login that fails', () => {
  test('says the same whatever was wrong, never shows the password, and says how long to wait', async () => {
    const { url } = await closedSite();
    const token = hidden(await (await fetch(`${url}login`)).text(), 'token');
    const answers = await Promise.all(
      ['duty', 'nobody'].map((name) => post(url, 'login', { name, password: 'guessed-it', next: '/', token })),
    );
    const texts = await Promise.all(answers.map((answer) => answer.text()));
    expect(answers.map(({ status }) => status)).toEqual([401, 401]);
    expect(texts[0]?.replace('value="duty"', '')).toBe(texts[1]?.replace('value="nobody"', ''));
    expect(texts.join()).not.toContain('guessed-it');
    const held = await post(url, 'login', { name: 'duty', password: 'again and again', next: '/', token });
    expect([held.status, held.headers.get('retry-after')]).toEqual([429, '30']);
  });

  test('a form that is no form, or too long, is refused', async () => {
    const { url } = await closedSite();
    expect((await post(url, 'login', { password: 'x'.repeat(10_000) })).status).toBe(413);
    expect((await post(url, 'login', { stranger: '1' })).status).toBe(400);
  });
});

describe('E8: the cookie', () => {
  test('cannot be read by scripts nor sent by other pages; a second one of its name is not believed', async () => {
    const { url } = await closedSite();
    const token = hidden(await (await fetch(`${url}login`)).text(), 'token');
    const answer = await post(url, 'login', { name: 'duty', password: 'right', next: '/', token });
    expect(answer.headers.get('set-cookie')).toBe(
      'spinvigil=token-duty-0; Path=/; Max-Age=43200; HttpOnly; SameSite=Strict',
    );
    const status = async (cookie: string) =>
      (await fetch(url, { headers: { Cookie: cookie }, redirect: 'manual' })).status;
    expect(await status('other=1; spinvigil=token-duty-0')).toBe(200);
    expect(await status('spinvigil=planted; spinvigil=token-duty-0')).toBe(303);
    expect(await status('spinvigil=')).toBe(303);
  });

  test('that was there before the login is given up with it', async () => {
    const { url, gate } = await closedSite();
    const before = await logIn(url);
    await logIn(url, 'timing', { Cookie: before });
    expect([...gate.open.values()]).toEqual(['timing']);
  });
});

test('where nobody needs to log in there is no login', async () => {
  const { url } = await startSite({ desk: memoryDesk() });
  const answer = await fetch(`${url}login?next=/feeds`, { redirect: 'manual' });
  expect([answer.status, answer.headers.get('location')]).toEqual([303, '/feeds']);
  expect((await fetch(`${url}account`, { redirect: 'manual' })).headers.get('location')).toBe('/login');
});
