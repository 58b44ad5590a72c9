import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import { type AddressInfo, createServer as createTcpServer } from 'node:net';
import { setTimeout as pause } from 'node:timers/promises';
import { afterEach, describe, expect, test } from 'vitest';
import type { HeartbeatSettings } from '../../daemon/config/heartbeatSettings.ts';
import type { Pulse } from '../../daemon/health.ts';
import { silentLog } from '../../daemon/log.ts';
import { createProgress } from '../../daemon/progress.ts';
import { startHeartbeats } from '../../daemon/schedule/heartbeat.ts';
import { mailHeartbeat } from '../../daemon/schedule/ownMail.ts';
import { knock } from '../../daemon/schedule/webKnock.ts';
import { createTestStation } from '../support/station.ts';
import { syntheticPulsar } from '../support/syntheticPulsar.ts';
import { within } from '../support/within.ts';

const endings: (() => unknown)[] = [];
afterEach(async () => {
  for (const end of endings.splice(0).reverse()) await end();
});

interface Ear {
  readonly url: string;
  readonly heard: { readonly line: string; readonly headers: readonly string[]; readonly body: string }[];
}

/** Somebody outside who listens for the heartbeat. */
async function ear(answer: (outgoing: ServerResponse, incoming: IncomingMessage) => void): Promise<Ear> {
  const heard: Ear['heard'] = [];
  const server: Server = createServer((incoming, outgoing) => {
    let body = '';
    incoming.on('data', (chunk) => (body += chunk));
    incoming.on('end', () => {
      heard.push({ line: `${incoming.method} ${incoming.url}`, headers: incoming.rawHeaders, body });
      answer(outgoing, incoming);
    });
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  endings.push(() => {
    server.closeAllConnections();
    server.close();
  });
  return { url: `http://127.0.0.1:${(server.address() as AddressInfo).port}/alive/s3cret`, heard };
}

const well = (outgoing: ServerResponse) => void outgoing.end('ok');

describe('F-11: the heartbeat over the web', () => {
  test('is one GET that carries nothing', async () => {
    const at = await ear(well);
    expect(await knock(at.url, 2000)).toEqual({ heard: true });
    const { host } = new URL(at.url);
    expect(at.heard).toEqual([
      { line: 'GET /alive/s3cret', headers: ['Accept', '*/*', 'Host', host, 'Connection', 'close'], body: '' },
    ]);
  });

  test('follows nobody to another address', async () => {
    const elsewhere = await ear(well);
    const at = await ear((outgoing) => void outgoing.writeHead(302, { Location: elsewhere.url }).end());
    expect(await knock(at.url, 2000)).toEqual({ heard: false, why: '127.0.0.1 answered with status 302' });
    expect(elsewhere.heard).toEqual([]);
  });

  test('throws a huge answer away unread', async () => {
    let written = 0;
    const at = await ear((outgoing) => {
      const more = () => {
        while (!outgoing.destroyed && outgoing.write(Buffer.alloc(65_536))) written += 65_536;
        if (!outgoing.destroyed) outgoing.once('drain', more);
      };
      more();
    });
    expect(await knock(at.url, 2000)).toEqual({ heard: true });
    await pause(200);
    expect(written).toBeLessThan(16 * 2 ** 20);
  });

  test('gives up on an answer that never comes, drips, or is none, and on a port where nobody listens', async () => {
    const silent = await ear(() => {});
    expect(await knock(silent.url, 200)).toEqual({ heard: false, why: '127.0.0.1 did not answer within 0.2 s' });
    const babble = createTcpServer((socket) => {
      socket.on('error', () => {});
      socket.write('HTTP/1.1 200 OK\r\nX: ');
      const drip = setInterval(() => socket.write('x'.repeat(4096)), 10);
      socket.on('close', () => clearInterval(drip));
    });
    await new Promise<void>((resolve) => babble.listen(0, '127.0.0.1', resolve));
    const { port } = babble.address() as AddressInfo;
    expect(await knock(`http://127.0.0.1:${port}/`, 5000)).toEqual({
      heard: false,
      why: '127.0.0.1 cannot be reached (HPE_HEADER_OVERFLOW)',
    });
    await new Promise((resolve) => babble.close(resolve));
    expect(await knock(`http://127.0.0.1:${port}/`, 2000)).toMatchObject({
      why: expect.stringContaining('ECONNREFUSED'),
    });
  });
});

describe('the heartbeat', () => {
  const clock = { now: () => new Date('2026-12-01T08:00:00Z'), monotonicMs: () => performance.now() };
  const often = { everyMinutes: 0.0005 };

  function start(settings: HeartbeatSettings, pulse: () => Pulse, ready: Promise<unknown> = Promise.resolve()) {
    const mailed: string[][] = [];
    const mail = async (to: readonly string[]) => mailed.push([...to]) > 0;
    const beats = startHeartbeats({ settings, pulse, mail, clock, log: silentLog(), ready });
    endings.push(beats.stop);
    return { beats, mailed };
  }

  test('B11, B12: stops when any stage stops making progress, and goes on with it', async () => {
    const at = await ear(well);
    let nowMs = 0;
    const progress = createProgress({ monotonicMs: () => nowMs });
    const mail = progress.stage('mail', 1000);
    const pulse = () => ({ stopped: progress.late().map((stage) => `no progress: ${stage}`), mailBlocked: false });
    const { beats } = start({ web: { url: at.url, mailBlockedUrl: null, ...often }, mail: null }, pulse);
    expect(await within(5, () => at.heard.length >= 2)).toBe(true);
    nowMs = 1500;
    expect(await within(5, () => beats.signs()[0]?.trouble === 'held back: no progress: mail')).toBe(true);
    const before = at.heard.length;
    await pause(200);
    expect(at.heard.length).toBe(before);
    mail.step();
    expect(await within(5, () => at.heard.length > before)).toBe(true);
    expect(beats.signs()).toEqual([{ way: 'web', lastSentAt: '2026-12-01T08:00:00.000Z', trouble: null }]);
  });

  test('D17: says that mail is blocked by another path, or by stopping', async () => {
    const at = await ear(well);
    const blocked = () => ({ stopped: [], mailBlocked: true });
    const { beats } = start({ web: { url: at.url, mailBlockedUrl: null, ...often }, mail: null }, blocked);
    await pause(150);
    expect(at.heard).toEqual([]);
    expect(beats.signs()[0]?.trouble).toBe('held back: mail does not leave');
    start({ web: { url: at.url, mailBlockedUrl: `${at.url}/mail`, ...often }, mail: null }, blocked);
    expect(await within(5, () => at.heard.length > 0)).toBe(true);
    expect(at.heard[0]?.line).toBe('GET /alive/s3cret/mail');
  });

  test('waits until the watch is ready, and tells the page nothing of the address', async () => {
    const at = await ear(well);
    let isReady = () => {};
    const ready = new Promise<void>((resolve) => {
      isReady = resolve;
    });
    const pulse = () => ({ stopped: [], mailBlocked: false });
    const { beats, mailed } = start(
      { web: { url: at.url, mailBlockedUrl: null, everyMinutes: 60 }, mail: { to: ['a@b.example'], everyHours: 6 } },
      pulse,
      ready,
    );
    await pause(100);
    expect([at.heard.length, mailed.length]).toEqual([0, 0]);
    isReady();
    expect(await within(5, () => at.heard.length === 1 && mailed.length === 1)).toBe(true);
    expect(JSON.stringify(beats.signs())).not.toContain('s3cret');
  });

  test('by mail is queued once and no second time while the first has not left', async () => {
    const at = await createTestStation({
      pulsars: [syntheticPulsar({ name: 'KR 1', epochMjd: 61_000 })],
      now: '2026-06-01T08:00:00.000Z',
    });
    endings.push(at.close);
    expect(await mailHeartbeat(at.station, ['guard@kestrel.example'])).toBe(true);
    at.setNow('2026-06-01T14:00:00.000Z');
    expect(await mailHeartbeat(at.station, ['guard@kestrel.example'])).toBe(false);
    const mail = at.store.claimDue('2026-06-01T14:00:00.000Z');
    expect(mail).toMatchObject({ recipient: 'guard@kestrel.example', kind: 'notice' });
    expect(mail?.subject).toContain('the watch is alive');
    at.store.settle(mail?.id ?? 0, { kind: 'delivered', at: '2026-06-01T14:00:01.000Z' });
    expect(await mailHeartbeat(at.station, ['guard@kestrel.example'])).toBe(true);
  });
});
