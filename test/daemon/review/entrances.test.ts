import { spawnSync } from 'node:child_process';
import { chmodSync, mkdtempSync, rmSync } from 'node:fs';
import { request as httpsRequest } from 'node:https';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { admit, type Entrance } from '../../../daemon/review/guard.ts';
import { createVerdictTokens } from '../../../daemon/review/verdictToken.ts';
import { memoryDesk } from '../../support/reviewDesk.ts';
import { portOf } from './rawHttp.ts';
import { startSampleSite, startSite } from './reviewSite.ts';

const PROXY = { origin: 'https://watch.kestrel.example', addresses: ['192.0.2.10', '127.0.0.1'] };
const behind: Entrance = { scheme: 'http', isOwnAuthority: (name) => name === '127.0.0.1:8417', proxy: PROXY };
const alone: Entrance = { ...behind, proxy: null };

const seen = (headers: Record<string, string>, entrance = behind, peer = '192.0.2.10', method = 'GET') =>
  admit({ method, target: '/', rawHeaders: Object.entries(headers).flat() }, peer, entrance);

describe('E10: what a proxy says', () => {
  const said = { Host: 'watch.kestrel.example', 'X-Forwarded-For': '203.0.113.9, 198.51.100.4' };

  test('is believed of the named one, of its last word about the address', () => {
    expect(seen(said)).toEqual({ address: '198.51.100.4', forwarded: true, secure: true, origin: PROXY.origin });
    expect(seen({ ...said, Host: '127.0.0.1:8417' })).toMatchObject({ forwarded: true, origin: PROXY.origin });
    expect(seen(said, behind, '::ffff:192.0.2.10')).toMatchObject({ address: '198.51.100.4' });
  });

  test.each([
    ['from another address', said, '192.0.2.11', 403],
    ['without saying for whom', { Host: 'watch.kestrel.example' }, '192.0.2.10', 403],
    ['for nobody', { ...said, 'X-Forwarded-For': 'unknown' }, '192.0.2.10', 400],
    ['for a name', { ...said, 'X-Forwarded-For': '1.2.3.4, localhost' }, '192.0.2.10', 400],
    ['under another name', { ...said, Host: 'evil.test' }, '192.0.2.10', 421],
    ['for another name', { ...said, 'X-Forwarded-Host': 'evil.test' }, '192.0.2.10', 421],
    ['in plain HTTP', { ...said, 'X-Forwarded-Proto': 'http' }, '192.0.2.10', 403],
    ['without a host', { 'X-Forwarded-For': '1.2.3.4' }, '192.0.2.10', 400],
  ])('%s: refused', (_, headers, peer, status) => {
    expect(seen(headers as Record<string, string>, behind, peer)).toMatchObject({ status });
  });

  test('is not believed where none is named', () => {
    const lies = { 'X-Forwarded-For': '203.0.113.9', 'X-Forwarded-Proto': 'https', 'X-Forwarded-Host': 'evil.test' };
    const expected = { address: '127.0.0.1', forwarded: false, secure: false, origin: 'http://127.0.0.1:8417' };
    expect(seen({ Host: '127.0.0.1:8417', ...lies }, alone, '127.0.0.1')).toEqual(expected);
    expect(seen({ ...said }, alone, '192.0.2.10')).toMatchObject({ status: 421 });
  });

  test('a form must come from the address that browsers use', () => {
    const post = (origin: string) => seen({ ...said, Origin: origin }, behind, '192.0.2.10', 'POST');
    expect(post(PROXY.origin)).toMatchObject({ forwarded: true });
    for (const origin of ['http://watch.kestrel.example', 'http://127.0.0.1:8417', 'https://evil.test', 'null'])
      expect(post(origin)).toMatchObject({ status: 403 });
  });

  test('links in mail lead to the proxy', async () => {
    const { url } = await startSampleSite({ proxy: PROXY, reviewers: ['duty'] });
    expect(url).toBe('https://watch.kestrel.example/');
  });
});

const hasOpenssl = spawnSync('openssl', ['version']).status === 0;
if (!hasOpenssl) console.warn('SKIPPED: openssl is not installed, so that the page is not tried under TLS');

describe.skipIf(!hasOpenssl)('E14: beyond loopback', () => {
  let folder: string;
  const tls = () => ({ certificateFile: join(folder, 'cert.pem'), keyFile: join(folder, 'key.pem') });

  beforeAll(() => {
    folder = mkdtempSync(join(tmpdir(), 'spinvigil-tls-'));
    const names = 'subjectAltName=DNS:watch.kestrel.example,DNS:*.ridge.example,IP:127.0.0.1';
    const { keyFile, certificateFile } = tls();
    const args = ['req', '-x509', '-newkey', 'ec', '-pkeyopt', 'ec_paramgen_curve:prime256v1', '-nodes', '-days', '2'];
    const made = spawnSync('openssl', [
      ...args,
      '-subj',
      '/CN=x',
      '-addext',
      names,
      '-keyout',
      keyFile,
      '-out',
      certificateFile,
    ]);
    if (made.status !== 0) throw new Error(String(made.stderr));
    chmodSync(keyFile, 0o600);
  });
  afterAll(() => rmSync(folder, { recursive: true, force: true }));

  const ask = (port: number, host: string, path = '/', options: object = {}) =>
    new Promise<{ status: number; headers: NodeJS.Dict<string | string[]> }>((resolve, reject) => {
      const request = httpsRequest(
        { host: '127.0.0.1', port, path, headers: { Host: host }, rejectUnauthorized: false, agent: false, ...options },
        (answer) => {
          answer.resume();
          resolve({ status: answer.statusCode ?? 0, headers: answer.headers });
        },
      );
      request.on('error', reject);
      request.end();
    });

  test('with TLS it listens everywhere, answers under the names of its certificate, and says its address by one', async () => {
    const { url } = await startSampleSite({ host: '0.0.0.0', tls: tls(), reviewers: ['duty'] });
    const { port } = new URL(url);
    expect(url).toBe(`https://watch.kestrel.example:${port}/`);
    for (const name of ['watch.kestrel.example', 'east.ridge.example', '127.0.0.1', 'localhost'])
      expect([name, (await ask(Number(port), `${name}:${port}`)).status]).toEqual([name, 200]);
    for (const name of [`evil.test:${port}`, `ridge.example:${port}`, 'watch.kestrel.example', `192.0.2.7:${port}`])
      expect([name, (await ask(Number(port), name)).status]).toEqual([name, 421]);
    const { headers } = await ask(Number(port), `localhost:${port}`, '/nothing');
    expect(headers['strict-transport-security']).toBe('max-age=31536000');
    expect(headers['content-security-policy']).toContain("default-src 'none'");
  });

  test('plain HTTP and old TLS get no answer', async () => {
    const { url } = await startSampleSite({ host: '127.0.0.1', tls: tls(), reviewers: ['duty'] });
    expect(url).toMatch(/^https:\/\/127\.0\.0\.1:/);
    await expect(fetch(`http://127.0.0.1:${portOf(url)}/`)).rejects.toThrow();
    await expect(ask(portOf(url), `127.0.0.1:${portOf(url)}`, '/', { maxVersion: 'TLSv1.1' })).rejects.toThrow();
    expect((await ask(portOf(url), `127.0.0.1:${portOf(url)}`)).status).toBe(200);
  });

  test('the cookie of a login is bound to this host, and its origin is https', async () => {
    const gate = {
      isClosed: () => true,
      logIn: async () => ({ kind: 'in', token: 't' }) as const,
      sessionOf: (token: string) => (token === 't' ? { id: 'i', reviewer: 'duty' } : null),
      logOut: () => {},
    };
    const tokens = createVerdictTokens();
    const { url } = await startSite({ desk: memoryDesk(), gate, tokens, tls: tls(), reviewers: ['duty'] });
    const host = `127.0.0.1:${portOf(url)}`;
    const body = new URLSearchParams({ name: 'duty', password: 'p', token: tokens.issueFor('log in', '') }).toString();
    const post = (origin: string) =>
      new Promise<string[]>((resolve, reject) => {
        const headers = { Host: host, Origin: origin, 'Content-Type': 'application/x-www-form-urlencoded' };
        const request = httpsRequest(
          {
            host: '127.0.0.1',
            port: portOf(url),
            method: 'POST',
            path: '/login',
            headers,
            rejectUnauthorized: false,
            agent: false,
          },
          (answer) => {
            answer.resume();
            resolve([String(answer.statusCode), ...(answer.headers['set-cookie'] ?? [])]);
          },
        );
        request.on('error', reject);
        request.end(body);
      });
    expect(await post(`http://${host}`)).toEqual(['403']);
    expect(await post(`https://${host}`)).toEqual([
      '303',
      '__Host-spinvigil=t; Path=/; Max-Age=43200; HttpOnly; SameSite=Strict; Secure',
    ]);
    const status = async (cookie: string) =>
      (await ask(portOf(url), host, '/', { headers: { Host: host, Cookie: cookie } })).status;
    expect(await status('__Host-spinvigil=t')).toBe(200);
    expect(await status('spinvigil=t')).toBe(303);
  });

  test('without reviewers, with a key that others can read, or that is not the certificate’s, it refuses to start', async () => {
    await expect(startSampleSite({ host: '0.0.0.0', tls: tls() })).rejects.toThrow(/no reviewers/);
    await expect(startSampleSite({ proxy: PROXY })).rejects.toThrow(/no reviewers/);
    chmodSync(tls().keyFile, 0o640);
    await expect(startSampleSite({ tls: tls(), reviewers: ['duty'] })).rejects.toThrow(/chmod 600/);
    chmodSync(tls().keyFile, 0o600);
    const other = join(folder, 'other.pem');
    spawnSync('openssl', ['genpkey', '-algorithm', 'ed25519', '-out', other]);
    chmodSync(other, 0o600);
    const wrong = { ...tls(), keyFile: other };
    await expect(startSampleSite({ tls: wrong, reviewers: ['duty'] })).rejects.toThrow(/is not the key/);
  });
});
