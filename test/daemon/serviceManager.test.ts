import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, describe, expect, test } from 'vitest';
import { createLog, silentLog } from '../../daemon/log.ts';
import { createServiceManager } from '../../daemon/serviceManager.ts';
import { openNotifySocket, whyNoNotifySocket } from '../support/notifySocket.ts';

const missing = whyNoNotifySocket();
if (missing !== null) console.warn(`SKIPPED: ${missing}, so that nothing is said to a service manager`);

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'spinvigil-notify-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const log = silentLog();

describe('the service manager', () => {
  test.skipIf(missing !== null)('hears every word, in order', async () => {
    const socket = await openNotifySocket(join(folder, 'notify'));
    try {
      const manager = createServiceManager({ environment: { ...process.env, NOTIFY_SOCKET: socket.path }, log });
      void manager.tell('READY=1', 'STATUS=watching; all “well”');
      void manager.tell('WATCHDOG=1');
      await manager.tell('STOPPING=1');
      expect(socket.messages()).toEqual([['READY=1', 'STATUS=watching; all “well”'], ['WATCHDOG=1'], ['STOPPING=1']]);
    } finally {
      await socket.close();
    }
  });

  test('B18: where there is none, nothing is started', async () => {
    const manager = createServiceManager({ environment: {}, log, helper: '/nonexistent' });
    await manager.tell('READY=1');
    expect(manager.watchdogMs).toBeNull();
  });

  test('a helper that is missing is complained of once, and keeps nothing waiting', async () => {
    const lines: string[] = [];
    const environment = { NOTIFY_SOCKET: '/run/none' };
    const manager = createServiceManager({
      environment,
      log: createLog({ write: (line) => lines.push(line) }),
      helper: join(folder, 'none'),
    });
    await manager.tell('READY=1');
    await manager.tell('WATCHDOG=1');
    expect(lines).toHaveLength(1);
    expect(lines[0]).toContain('systemd cannot be told');
  });

  test.each([
    [{}, null],
    [{ WATCHDOG_USEC: '180000000' }, 60_000],
    [{ WATCHDOG_USEC: '180000000', WATCHDOG_PID: String(process.pid) }, 60_000],
    [{ WATCHDOG_USEC: '180000000', WATCHDOG_PID: '1' }, null],
    [{ WATCHDOG_USEC: 'soon' }, null],
  ])('with %o says that it lives every %s ms', (words, everyMs) => {
    expect(createServiceManager({ environment: { NOTIFY_SOCKET: '/x', ...words }, log }).watchdogMs).toBe(everyMs);
  });
});
