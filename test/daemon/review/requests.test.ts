import { describe, expect, test } from 'vitest';
import { SECURITY_HEADERS } from '../../../daemon/review/headers.ts';
import { memoryDesk } from '../../support/reviewDesk.ts';
import { portOf, sendRaw, sendRequest } from './rawHttp.ts';
import { fillForm, postVerdict, startSampleSite, startSite } from './reviewSite.ts';

// Requests that no browser on the page would send. Ids are those of the fault list.

const TRAVERSALS = [
  '/../../etc/passwd',
  '/assets/../../../etc/passwd',
  '/assets/..%2f..%2fetc/passwd',
  '/%2e%2e%2f%2e%2e%2fetc%2fpasswd',
  '/%252e%252e%252fetc%252fpasswd',
  '/..\\..\\etc\\passwd',
  '/%5c..%5cetc',
  '//etc/passwd',
  '/events/..%2f..%2fetc%2fpasswd',
  '/events/kr-0417-61370/%2e%2e/%2e%2e/etc/passwd',
  '/assets/review.css%00.js',
  'http://127.0.0.1/etc/passwd',
  'file:///etc/passwd',
  '*',
];

describe('E1: path traversal', () => {
  test.each(TRAVERSALS)('%s', async (target) => {
    const { url } = await startSampleSite();
    const answer = await sendRequest(url, `GET ${target} HTTP/1.1`);
    expect([400, 404]).toContain(answer.status);
    expect(answer.body).not.toContain('root:');
  });
});

describe('E3: names of this page', () => {
  const names = (port: number) => ({
    good: [`127.0.0.1:${port}`, `localhost:${port}`, `LOCALHOST:${port}`, `[::1]:${port}`],
    foreign: [
      'evil.test',
      `evil.test:${port}`,
      `localhost.evil.test:${port}`,
      `127.0.0.1.evil.test:${port}`,
      `127.0.0.1:${port + 1}`,
      '127.0.0.1',
      'localhost',
      `localhost.:${port}`,
      `0.0.0.0:${port}`,
      `[::ffff:127.0.0.1]:${port}`,
      `2130706433:${port}`,
      `user@127.0.0.1:${port}`,
    ],
  });

  test('answers under its own names only, whatever is asked for', async () => {
    const { url } = await startSampleSite();
    const { good, foreign } = names(portOf(url));
    for (const name of good) {
      expect([name, (await sendRequest(url, 'GET / HTTP/1.1', [`Host: ${name}`])).status]).toEqual([name, 200]);
    }
    for (const name of foreign) {
      for (const target of ['/', '/healthz', '/api/events', '/no/such/page']) {
        const answer = await sendRequest(url, `GET ${target} HTTP/1.1`, [`Host: ${name}`]);
        expect([name, answer.status]).toEqual([name, 421]);
        expect(answer.body).not.toContain('KR 0417+31');
      }
    }
  });

  test('needs exactly one Host', async () => {
    const { url } = await startSampleSite();
    const host = `Host: 127.0.0.1:${portOf(url)}`;
    expect((await sendRequest(url, 'GET / HTTP/1.1', [])).status).toBe(400);
    expect((await sendRequest(url, 'GET / HTTP/1.0', [])).status).toBe(400);
    expect((await sendRequest(url, 'GET / HTTP/1.1', ['Host:'])).status).toBe(400);
    expect((await sendRequest(url, 'GET / HTTP/1.1', [host, 'Host: evil.test'])).status).toBe(400);
    expect((await sendRequest(url, 'GET / HTTP/1.1', ['Host: evil.test', host])).status).toBe(400);
  });

  test('takes no notice of what a proxy may claim', async () => {
    const { url } = await startSampleSite();
    const claims = [`Host: evil.test`, `X-Forwarded-Host: 127.0.0.1:${portOf(url)}`, 'X-Forwarded-For: 127.0.0.1'];
    expect((await sendRequest(url, 'GET / HTTP/1.1', claims)).status).toBe(421);
  });
});

describe('E6: sizes', () => {
  test('a huge head is 431, and many bytes of body 413, with flat memory', async () => {
    const { url, desk } = await startSampleSite();
    const host = `Host: 127.0.0.1:${portOf(url)}`;
    expect((await sendRequest(url, 'GET / HTTP/1.1', [host, `X-Long: ${'a'.repeat(20_000)}`])).status).toBe(431);
    expect((await sendRequest(url, `GET /${'a'.repeat(3000)} HTTP/1.1`)).status).toBe(414);
    const form = await fillForm(url);
    expect((await postVerdict(url, { ...form, note: 'x'.repeat(70_000) })).status).toBe(413);
    expect(desk.verdictCount()).toBe(0);
  });

  test('a body that never ends is cut off', async () => {
    const { url } = await startSampleSite();
    const head = [
      'POST /events/kr-0417-61370/verdict HTTP/1.1',
      `Host: 127.0.0.1:${portOf(url)}`,
      `Origin: ${url.slice(0, -1)}`,
      'Content-Type: application/x-www-form-urlencoded',
      'Transfer-Encoding: chunked',
    ].join('\r\n');
    const chunk = `2000\r\n${'a'.repeat(0x2000)}\r\n`;
    const answer = await sendRaw(url, `${head}\r\n\r\n${chunk.repeat(20)}`);
    expect(answer.status).toBe(413);
  });

  test.each([
    ['Content-Length: 5', 'Content-Length: 6'],
    ['Content-Length: 5', 'Transfer-Encoding: chunked'],
    ['Content-Length: -1'],
    ['Content-Length: 99999999999999999999'],
    ['Transfer-Encoding: chunked, gzip'],
  ])('E9: a head that contradicts itself is refused: %s %s', async (...lengths) => {
    const { url } = await startSampleSite();
    const headers = [`Host: 127.0.0.1:${portOf(url)}`, `Origin: ${url.slice(0, -1)}`, ...lengths];
    const answer = await sendRequest(url, 'POST /events/kr-0417-61370/verdict HTTP/1.1', headers, 'a=b&c');
    expect(answer.status).toBe(400);
  });

  test.each([
    ['a folded header', 'Host: 127.0.0.1:PORT\r\nX-Long: a\r\n b\r\n'],
    ['a space before the colon', 'Host: 127.0.0.1:PORT\r\nContent-Length : 0\r\n'],
    ['a header without a name', 'Host: 127.0.0.1:PORT\r\n: x\r\n'],
    ['a bare line feed', 'Host: 127.0.0.1:PORT\nX-Other: a\n'],
  ])('E9: %s ends the connection', async (_, headers) => {
    const { url } = await startSampleSite();
    const own = headers.replace('PORT', String(portOf(url)));
    const second = `GET /feeds HTTP/1.1\r\nHost: 127.0.0.1:${portOf(url)}\r\nConnection: close\r\n\r\n`;
    const answer = await sendRaw(url, `GET / HTTP/1.1\r\n${own}\r\n${second}`);
    expect([400, 421]).toContain(answer.status);
    expect(answer.body).not.toContain('<h1>Feeds</h1>');
  });

  test('a compressed body or another kind of body is refused', async () => {
    const { url, desk } = await startSampleSite();
    const form = await fillForm(url);
    expect((await postVerdict(url, form, { 'Content-Encoding': 'gzip' })).status).toBe(415);
    expect((await postVerdict(url, JSON.stringify(form), { 'Content-Type': 'application/json' })).status).toBe(415);
    expect((await postVerdict(url, '['.repeat(60_000), { 'Content-Type': 'text/plain' })).status).toBe(415);
    expect(desk.verdictCount()).toBe(0);
  });

  test('other methods are refused', async () => {
    const { url } = await startSampleSite();
    for (const method of ['PUT', 'DELETE', 'PATCH', 'OPTIONS', 'TRACE']) {
      const answer = await sendRequest(url, `${method} / HTTP/1.1`);
      expect([method, answer.status, answer.headers.get('allow')]).toEqual([method, 405, 'GET, HEAD, POST']);
    }
    expect((await sendRequest(url, 'CONNECT evil.test:443 HTTP/1.1')).status).toBe(0);
    expect(
      (await sendRequest(url, 'POST / HTTP/1.1', [`Host: 127.0.0.1:${portOf(url)}`, `Origin: ${url.slice(0, -1)}`]))
        .status,
    ).toBe(404);
  });
});

describe('E13: encodings', () => {
  test.each(['/%', '/%zz', '/events/%ff', '/events/%c3%28', '/events/%ed%a0%80', '/events/a%0d%0ab'])(
    'malformed address %s is 400',
    async (target) => {
      const { url } = await startSampleSite();
      expect((await sendRequest(url, `GET ${target} HTTP/1.1`)).status).toBe(400);
    },
  );

  test.each(['note=%', 'note=%zz', 'note=%ff', 'note=%ed%a0%80', 'note=a&note=b', 'stranger=1'])(
    'malformed form %s is 400 and changes nothing',
    async (extra) => {
      const { url, desk } = await startSampleSite();
      const { note: _, ...rest } = await fillForm(url);
      const answer = await postVerdict(url, `${new URLSearchParams(rest)}&${extra}`);
      expect([answer.status, desk.verdictCount()]).toEqual([400, 0]);
    },
  );

  test('odd text in a note is kept as it is, but for control characters', async () => {
    const { url, desk } = await startSampleSite();
    const note = 'ν̇ jumped — 𝛿ν/ν 二; =HYPERLINK("x") \u202e txt\ttab\r\nline\rline\u0000\u0007\u009b';
    expect((await postVerdict(url, await fillForm(url, undefined, { note }))).status).toBe(303);
    const kept = desk.event('kr-0417-61370')?.verdicts[0]?.note;
    expect(kept).toBe('ν̇ jumped — 𝛿ν/ν 二; =HYPERLINK("x") \u202e txt\ttab\nline\nline\ufffd\ufffd\ufffd');
    expect(await (await fetch(`${url}events/kr-0417-61370`)).text()).not.toContain('\u202e');
  });
});

describe('E14: beyond loopback', () => {
  test.each(['0.0.0.0', '::', '192.0.2.7', 'kestrel.example'])('refuses to listen on %s', async (host) => {
    await expect(startSampleSite({ host })).rejects.toThrow(/can be reached from other machines/);
  });

  test('says which port is taken', async () => {
    const { url } = await startSampleSite();
    await expect(startSampleSite({ port: portOf(url) })).rejects.toThrow(
      `127.0.0.1:${portOf(url)}: the port is in use`,
    );
  });
});

describe('E16: faults', () => {
  test('the visitor gets an id, the log the error', async () => {
    const faults: { id: string; error: unknown }[] = [];
    const broken = {
      ...memoryDesk(),
      feeds: () => {
        throw new Error('/var/lib/spinvigil/state.db: disk I/O error');
      },
    };
    const { url } = await startSite({ desk: broken, onFault: (fault) => faults.push(fault) });
    const answer = await fetch(`${url}feeds`);
    const body = await answer.text();
    expect(answer.status).toBe(500);
    expect(body).toContain(faults[0]?.id);
    expect(body).not.toMatch(/\/var|disk I\/O|node|hono|at .*\.ts/i);
    expect(String(faults[0]?.error)).toContain('disk I/O error');
    expect((await fetch(url)).status).toBe(200);
  });
});

describe('E17: headers', () => {
  const PATHS = [
    '/',
    '/pulsars',
    '/feeds',
    '/mail',
    '/health',
    '/metrics',
    '/login',
    '/events/kr-0417-61370',
    '/events/none',
    '/nothing',
    '/healthz',
  ];
  const MORE = ['/api/events', '/api/version', '/assets/review.css', '/assets/review.js', '/assets/mark.svg', '/%ff'];

  test('stand on every answer, errors and refusals included', async () => {
    const { url } = await startSampleSite();
    const host = `Host: 127.0.0.1:${portOf(url)}`;
    const answers = [
      ...(await Promise.all([...PATHS, ...MORE].map((path) => sendRequest(url, `GET ${path} HTTP/1.1`)))),
      await sendRequest(url, 'GET / HTTP/1.1', ['Host: evil.test']),
      await sendRequest(url, 'POST / HTTP/1.1', [host]),
      await sendRequest(url, 'DELETE / HTTP/1.1'),
      await sendRequest(url, 'GET / HTTP/1.1', [host, `X-Long: ${'a'.repeat(20_000)}`]),
      await sendRaw(url, 'not http at all\r\n\r\n'),
    ];
    for (const { status, headers } of answers) {
      expect(status).toBeGreaterThanOrEqual(200);
      for (const [name, value] of SECURITY_HEADERS)
        expect([status, headers.get(name.toLowerCase())]).toEqual([status, value]);
    }
    expect(new Set(answers.map(({ status }) => status))).toEqual(new Set([200, 303, 404, 400, 421, 403, 405, 431]));
    expect(answers[0]?.headers.has('server') || answers[0]?.headers.has('x-powered-by')).toBe(false);
  });
});
