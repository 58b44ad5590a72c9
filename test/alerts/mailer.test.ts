import { execFileSync } from 'node:child_process';
import { mkdtempSync, readFileSync, rmSync } from 'node:fs';
import type { AddressInfo } from 'node:net';
import { createServer } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { TLSSocket } from 'node:tls';
import { SMTPServer, type SMTPServerOptions } from 'smtp-server';
import { afterAll, afterEach, beforeAll, describe, expect, it } from 'vitest';
import { createMailer, type DeliveryOutcome, type MailTransport } from '../../alerts/index.ts';
import { type Reply, type ScriptedServer, type Step, scriptedServer } from './scriptedServer.ts';

const MIME = Buffer.from(
  'Message-ID: <a@b.example>\r\nSubject: x\r\n\r\nfirst\r\n.second begins with a dot\r\n..\r\nend\r\n',
);
/** Generous, so that a busy machine is not taken for a silent server. */
const PATIENT = { connectMs: 20_000, greetingMs: 20_000, silenceMs: 20_000, sessionMs: 40_000 };
/** For servers that hang on purpose. */
const HASTY = { ...PATIENT, greetingMs: 300, silenceMs: 300 };
const FROM = 'watch@kestrel-ridge.example';

const open: { close(): Promise<void> }[] = [];
afterEach(async () => {
  for (const server of open.splice(0)) await server.close();
});

function plain(port: number): MailTransport {
  return { kind: 'smtp', host: '127.0.0.1', port, secure: 'none', user: null };
}

async function scripted(script: Partial<Record<Step, Reply>>): Promise<ScriptedServer> {
  const server = await scriptedServer(script);
  open.push(server);
  return server;
}

async function smtpServer(options: SMTPServerOptions): Promise<{ port: number; bodies: Buffer[] }> {
  const bodies: Buffer[] = [];
  const server = new SMTPServer({
    disableReverseLookup: true,
    onData(stream, _session, callback) {
      const chunks: Buffer[] = [];
      stream.on('data', (chunk: Buffer) => chunks.push(chunk));
      stream.on('end', () => {
        bodies.push(Buffer.concat(chunks));
        callback();
      });
    },
    ...options,
  });
  server.on('error', () => undefined);
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  open.push({ close: () => new Promise((resolve) => server.close(resolve)) });
  return { port: (server.server.address() as AddressInfo).port, bodies };
}

function deliver(
  transport: MailTransport,
  recipient = 'duty@kestrel-ridge.example',
  mime = MIME,
  timeouts = PATIENT,
): Promise<DeliveryOutcome> {
  return createMailer(transport, { password: () => null, timeouts }).send({ from: FROM, recipient, mime });
}

describe('one delivery', () => {
  it('hands over every byte, dots included, in one transaction', async () => {
    const server = await scripted({});
    const outcome = await deliver(plain(server.port));
    expect(outcome).toEqual({ state: 'delivered', detail: '250 taken', responseCode: 250 });
    expect(server.bodies).toEqual([MIME.toString()]);
    expect(server.commands.filter((c) => /^(MAIL|RCPT)/.test(c))).toEqual([
      `MAIL FROM:<${FROM}>`,
      'RCPT TO:<duty@kestrel-ridge.example>',
    ]);
  });

  it('carries a mail of a megabyte unchanged', async () => {
    const server = await scripted({});
    const large = Buffer.from(`Subject: x\r\n\r\n${'.0123456789'.repeat(6)}\r\n`.repeat(14_000));
    expect((await deliver(plain(server.port), undefined, large)).state).toBe('delivered');
    expect(server.bodies[0]).toBe(large.toString());
  });

  // RFC 5321 §4.2.1: 4yz may pass later
  it.each(['greeting', 'EHLO', 'MAIL', 'RCPT', 'DATA', 'dot'] as const)('D2: 421 or 451 at %s: later', async (step) => {
    const server = await scripted({ [step]: step === 'EHLO' || step === 'greeting' ? '421 busy' : '451 greylisted' });
    const outcome = await deliver(plain(server.port));
    expect(outcome).toMatchObject({ state: 'later', responseCode: step === 'EHLO' || step === 'greeting' ? 421 : 451 });
  });

  it.each(['MAIL', 'RCPT', 'DATA', 'dot'] as const)('D3: 550 at %s: refused, for good', async (step) => {
    const server = await scripted({ [step]: '550 5.1.1 no such user' });
    const outcome = await deliver(plain(server.port));
    expect(outcome).toMatchObject({ state: 'refused', responseCode: 550 });
    expect(outcome.detail).toContain('no such user');
  });

  it('D3: 554 in the greeting is about the server, not the recipient: later', async () => {
    const server = await scripted({ greeting: '554 not now' });
    expect(await deliver(plain(server.port))).toMatchObject({ state: 'later', responseCode: 554 });
  });

  it('D11: 552 says that the mail was too large', async () => {
    const server = await scripted({ dot: '552 too large' });
    expect(await deliver(plain(server.port))).toMatchObject({ state: 'refused', tooLarge: true });
  });

  it.each(['drop', 'hang'] as const)('D9: %s after the final dot: unknown', async (what) => {
    const server = await scripted({ dot: what });
    const outcome = await deliver(plain(server.port), undefined, MIME, { ...PATIENT, silenceMs: 1_500 });
    expect(server.bodies).toHaveLength(1);
    expect(outcome.state).toBe('unknown');
  });

  it('D5: a server that drips keeps nobody for longer than a session may last', async () => {
    const server = await scripted({ EHLO: 'hang' });
    const outcome = await deliver(plain(server.port), undefined, MIME, { ...PATIENT, sessionMs: 400 });
    expect(outcome).toEqual({ state: 'later', detail: 'no end of the session within 0.4 s' });
  });

  it.each(['greeting', 'EHLO', 'MAIL', 'RCPT', 'DATA'] as const)('D5: drop or hang at %s: later', async (step) => {
    for (const what of ['drop', 'hang'] as const) {
      const server = await scripted({ [step]: what });
      expect(await deliver(plain(server.port), undefined, MIME, HASTY)).toMatchObject({ state: 'later' });
      expect(server.bodies).toHaveLength(0);
    }
  });

  it('D5: a server that never ends its reply is cut off', async () => {
    const server = await scripted({ EHLO: '250-more\r\n'.repeat(20_000).trimEnd() });
    expect((await deliver(plain(server.port))).state).toBe('later');
  });

  it('D1: nobody listens: later', async () => {
    const server = await scripted({});
    await server.close();
    expect(await deliver(plain(server.port))).toMatchObject({ state: 'later' });
  });

  it('D7: three recipients, three outcomes', async () => {
    const server = await smtpServer({
      authOptional: true,
      disabledCommands: ['STARTTLS'],
      onRcptTo({ address }, _session, callback) {
        const code = { gone: 550, slow: 451 }[address.split('@')[0] ?? ''];
        callback(code === undefined ? null : Object.assign(new Error('not today'), { responseCode: code }));
      },
    });
    const outcomes = [];
    for (const name of ['good', 'gone', 'slow'])
      outcomes.push((await deliver(plain(server.port), `${name}@kestrel-ridge.example`)).state);
    expect(outcomes).toEqual(['delivered', 'refused', 'later']);
    expect(server.bodies).toHaveLength(1);
  });

  it('D14: an address cannot smuggle a command', async () => {
    const server = await scripted({});
    const outcome = await deliver(plain(server.port), 'a@b.example>\r\nRCPT TO:<victim@b.example');
    expect(outcome.state).toBe('refused');
    expect(server.commands.some((c) => c.includes('victim'))).toBe(false);
  });

  it('sends nothing in plain text over an open network', () => {
    expect(() =>
      createMailer(
        { kind: 'smtp', host: 'mail.example', port: 25, secure: 'none', user: null },
        { password: () => null },
      ),
    ).toThrow(/without encryption/);
  });
});

const hasOpenssl = (() => {
  try {
    execFileSync('openssl', ['version']);
    return true;
  } catch {
    console.warn('SKIPPED: no openssl on this machine: the tests of encrypted mail (D6, D10) did not run');
    return false;
  }
})();

describe.skipIf(!hasOpenssl)('encrypted', () => {
  let folder = '';
  const pair = (name: string) => ({
    key: readFileSync(join(folder, `${name}.key`), 'utf8'),
    cert: readFileSync(join(folder, `${name}.pem`), 'utf8'),
  });

  beforeAll(() => {
    folder = mkdtempSync(join(tmpdir(), 'spinvigil-cert-'));
    const make = (name: string, names: string) =>
      execFileSync(
        'openssl',
        [
          'req',
          '-x509',
          '-newkey',
          'ec',
          '-pkeyopt',
          'ec_paramgen_curve:P-256',
          '-nodes',
          '-days',
          '2',
          '-subj',
          `/CN=${name}`,
          '-addext',
          `subjectAltName=${names}`,
          '-keyout',
          join(folder, `${name}.key`),
          '-out',
          join(folder, `${name}.pem`),
        ],
        { stdio: 'ignore' },
      );
    make('right', 'IP:127.0.0.1');
    make('wrong', 'DNS:elsewhere.example');
  });
  afterAll(() => rmSync(folder, { recursive: true }));

  const session = (port: number, secure: 'tls' | 'starttls', trust: string | null, password = 'open sesame') =>
    createMailer(
      { kind: 'smtp', host: '127.0.0.1', port, secure, user: 'watch' },
      {
        password: () => password,
        timeouts: PATIENT,
        ...(trust === null ? {} : { trustedCertificates: pair(trust).cert }),
      },
    );
  const send = (mailer: ReturnType<typeof session>) =>
    mailer.send({ from: FROM, recipient: 'duty@kestrel-ridge.example', mime: MIME });

  async function guarded(options: SMTPServerOptions): Promise<{ port: number; bodies: Buffer[]; logins: string[] }> {
    const logins: string[] = [];
    const server = await smtpServer({
      ...options,
      onAuth({ username, password }, _session, callback) {
        logins.push(`${username}:${password}`);
        if (password === 'open sesame') callback(null, { user: username });
        else callback(Object.assign(new Error('no'), { responseCode: 535 }));
      },
    });
    return { ...server, logins };
  }

  it.each(['tls', 'starttls'] as const)('%s with a trusted certificate: logged in and delivered', async (secure) => {
    const server = await guarded({ ...pair('right'), secure: secure === 'tls' });
    expect(await send(session(server.port, secure, 'right'))).toMatchObject({ state: 'delivered' });
    expect(server.logins).toEqual(['watch:open sesame']);
    expect(server.bodies).toHaveLength(1);
  });

  it.each([
    ['self-signed and not trusted', 'right', null],
    ['for another name', 'wrong', 'wrong'],
  ] as const)('D6: a certificate %s: no login, no mail', async (_name, certificate, trust) => {
    for (const secure of ['tls', 'starttls'] as const) {
      const server = await guarded({ ...pair(certificate), secure: secure === 'tls' });
      expect(await send(session(server.port, secure, trust))).toMatchObject({ state: 'later' });
      expect(server.logins).toEqual([]);
      expect(server.bodies).toEqual([]);
    }
  });

  it('D6: STARTTLS stripped from the greeting, or refused: no login, no mail', async () => {
    for (const EHLO of ['250-kestrel\r\n250 AUTH PLAIN LOGIN', '250-kestrel\r\n250-STARTTLS\r\n250 AUTH PLAIN']) {
      const server = await scripted({ EHLO });
      expect(await send(session(server.port, 'starttls', 'right'))).toMatchObject({ state: 'later' });
      expect(server.commands.filter((c) => /^(AUTH|MAIL)/.test(c))).toEqual([]);
    }
  });

  it('D6: TLS below 1.2 is refused', async () => {
    const server = await guarded({
      ...pair('right'),
      secure: true,
      minVersion: 'TLSv1',
      maxVersion: 'TLSv1.1',
      ciphers: 'DEFAULT@SECLEVEL=0',
    } as SMTPServerOptions);
    expect(await send(session(server.port, 'tls', 'right'))).toMatchObject({ state: 'later' });
    expect(server.logins).toEqual([]);
  });

  it('D6: what came before the encryption is thrown away', async () => {
    const heard: string[] = [];
    const raw = createServer((socket) => {
      socket.on('error', () => undefined);
      socket.write('220 hello\r\n');
      const onPlain = (chunk: Buffer) => {
        if (chunk.toString().startsWith('EHLO')) {
          socket.write('250-hello\r\n250 STARTTLS\r\n');
          return;
        }
        socket.off('data', onPlain);
        socket.write('220 go\r\n250-injected\r\n250 AUTH PLAIN\r\n');
        const secured = new TLSSocket(socket, { isServer: true, ...pair('right') });
        secured.on('error', () => undefined);
        secured.on('data', (bytes) => {
          heard.push(bytes.toString());
          secured.write(bytes.toString().startsWith('EHLO') ? '250 hello again\r\n' : '221 bye\r\n');
        });
      };
      socket.on('data', onPlain);
    });
    await new Promise<void>((resolve) => raw.listen(0, '127.0.0.1', resolve));
    open.push({ close: () => new Promise((resolve) => raw.close(() => resolve())) });
    const outcome = await send(session((raw.address() as AddressInfo).port, 'starttls', 'right'));
    expect(heard[0]).toMatch(/^EHLO/);
    expect(heard.join('')).not.toMatch(/AUTH/);
    expect(outcome).toMatchObject({ state: 'later', loginRefused: true });
  });

  it('D10: a wrong password is tried once, and a rotated one is picked up', async () => {
    const server = await guarded({ ...pair('right') });
    let password = 'wrong';
    const mailer = createMailer(
      { kind: 'smtp', host: '127.0.0.1', port: server.port, secure: 'starttls', user: 'watch' },
      { password: () => password, timeouts: PATIENT, trustedCertificates: pair('right').cert },
    );
    const first = await send(mailer);
    expect(first).toMatchObject({ state: 'later', loginRefused: true, responseCode: 535 });
    expect(JSON.stringify(first)).not.toContain('wrong');
    expect(server.logins).toHaveLength(1);
    password = 'open sesame';
    expect((await send(mailer)).state).toBe('delivered');
  });

  it('verify logs in and sends nothing', async () => {
    const server = await guarded({ ...pair('right') });
    expect(await session(server.port, 'starttls', 'right').verify()).toMatchObject({ state: 'delivered' });
    expect(await session(server.port, 'starttls', 'right', 'no').verify()).toMatchObject({
      state: 'later',
      loginRefused: true,
    });
    expect(server.bodies).toEqual([]);
  });
});
