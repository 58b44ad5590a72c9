import { connect, type Socket } from 'node:net';
import { setTimeout as pause } from 'node:timers/promises';
import { describe, expect, test } from 'vitest';
import { startReviewServer } from '../../../daemon/review/server.ts';
import { memoryDesk } from '../../support/reviewDesk.ts';
import { parseAnswer, portOf, readToEnd } from './rawHttp.ts';
import { siteSettings, startSampleSite } from './reviewSite.ts';

// E5. The limits are shortened so that the tests are quick; what is asserted is that the server ends the connection by
// itself while the client would go on, and that others are served meanwhile.

const LIMITS = { headersMs: 400, requestMs: 800, idleMs: 1_500, keepAliveMs: 400, checkEveryMs: 50, connections: 40 };
const PATIENCE_MS = 20_000;

/** Writes a byte of `text` at a time for as long as the other side lets it, at most `PATIENCE_MS`. */
async function drip(url: string, text: string): Promise<{ readonly endedByServer: boolean; readonly answer: string }> {
  const socket = connect(portOf(url), '127.0.0.1');
  let ended = false;
  const answer = readToEnd(socket).then((read) => {
    ended = true;
    return read;
  });
  const began = performance.now();
  for (let i = 0; !ended && performance.now() - began < PATIENCE_MS; i++) {
    if (socket.writable) socket.write(text[i % text.length] ?? 'x');
    await pause(40);
  }
  socket.destroy();
  return { endedByServer: ended, answer: await answer };
}

describe('E5: slow and broken clients', () => {
  test('a head that drips is cut off while others are served', async () => {
    const { url } = await startSampleSite({ limits: LIMITS });
    const dripping = Array.from({ length: 10 }, () => drip(url, 'GET / HTTP/1.1\r\nX-A: '));
    expect((await fetch(`${url}healthz`)).status).toBe(200);
    for (const { endedByServer, answer } of await Promise.all(dripping)) {
      expect(endedByServer).toBe(true);
      expect(parseAnswer(answer).status).toBe(408);
    }
  });

  test('a body that drips is cut off, and is no fault for the log', async () => {
    const faults: unknown[] = [];
    const { url, desk } = await startSampleSite({ limits: LIMITS, onFault: (fault) => faults.push(fault) });
    const head = [
      'POST /events/kr-0417-61370/verdict HTTP/1.1',
      `Host: 127.0.0.1:${portOf(url)}`,
      `Origin: ${url.slice(0, -1)}`,
      'Content-Type: application/x-www-form-urlencoded',
      'Content-Length: 50000',
    ].join('\r\n');
    const socket = connect(portOf(url), '127.0.0.1');
    socket.write(`${head}\r\n\r\n`);
    const timer = setInterval(() => socket.writable && socket.write('a'), 40);
    const answer = parseAnswer(await readToEnd(socket));
    clearInterval(timer);
    expect([0, 408]).toContain(answer.status);
    expect([desk.verdictCount(), faults]).toEqual([0, []]);
    expect((await fetch(url)).status).toBe(200);
  });

  test('a thousand silent connections end by themselves, and the page answers again', async () => {
    const { url } = await startSampleSite({ limits: LIMITS });
    const ends: Promise<string>[] = [];
    for (let i = 0; i < 1000; i++) ends.push(readToEnd(connect(portOf(url), '127.0.0.1')));
    await Promise.all(ends);
    expect((await fetch(url)).status).toBe(200);
  });

  test('a pipelined flood is answered in part and then ended', async () => {
    const { url } = await startSampleSite({ limits: LIMITS });
    const socket = connect(portOf(url), '127.0.0.1');
    socket.write(`GET /healthz HTTP/1.1\r\nHost: 127.0.0.1:${portOf(url)}\r\n\r\n`.repeat(2000));
    const answered = (await readToEnd(socket)).split('HTTP/1.1 200 OK').length - 1;
    expect(answered).toBeGreaterThan(0);
    expect(answered).toBeLessThanOrEqual(200);
    expect((await fetch(url)).status).toBe(200);
  });

  test('half-closed and reset connections do no harm', async () => {
    const { url } = await startSampleSite({ limits: LIMITS });
    const request = `GET / HTTP/1.1\r\nHost: 127.0.0.1:${portOf(url)}\r\n\r\n`;
    const sockets: Socket[] = [];
    for (let i = 0; i < 20; i++) {
      const socket = connect(portOf(url), '127.0.0.1');
      socket.on('error', () => {});
      socket.write(i % 3 === 0 ? request.slice(0, 20) : request);
      if (i % 2 === 0) socket.end();
      else setTimeout(() => socket.resetAndDestroy(), 5);
      sockets.push(socket);
    }
    await pause(200);
    for (const socket of sockets) socket.destroy();
    expect((await fetch(url)).status).toBe(200);
  });

  test('closing ends every connection', async () => {
    const server = await startReviewServer(siteSettings({ desk: memoryDesk() }));
    const silent = readToEnd(connect(portOf(server.url), '127.0.0.1'));
    await (await fetch(server.url)).text();
    await server.close();
    expect(await silent).toBe('');
    await expect(fetch(server.url)).rejects.toThrow();
  });
});
