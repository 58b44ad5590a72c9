import { execFile } from 'node:child_process';
import { reasonOf } from './errors.ts';
import type { Log } from './log.ts';

/**
 * Tells systemd how the daemon stands (sd_notify(3)): ready, alive, reloading, stopping. Node has no datagrams over a unix socket, so the words go
 * through systemd's own helper `systemd-notify`; the unit says NotifyAccess=all, because the helper is a process of its own. Without NOTIFY_SOCKET
 * (in a container, in a terminal) nothing is done.
 */
export interface ServiceManager {
  tell(...words: readonly string[]): Promise<void>;
  /** How often to say that the daemon lives; null: nobody asked. */
  readonly watchdogMs: number | null;
}

export interface ServiceManagerOptions {
  readonly environment: NodeJS.ProcessEnv;
  readonly log: Log;
  /** Swapped in tests alone. */
  readonly helper?: string;
}

const HELPER = 'systemd-notify';
const HELPER_DEADLINE_MS = 10_000;

export function createServiceManager({ environment, log, helper = HELPER }: ServiceManagerOptions): ServiceManager {
  const { NOTIFY_SOCKET, WATCHDOG_USEC, WATCHDOG_PID } = environment;
  if (NOTIFY_SOCKET === undefined || NOTIFY_SOCKET === '') return { tell: async () => {}, watchdogMs: null };
  let complained = false;
  let last: Promise<void> = Promise.resolve();
  const send = (words: readonly string[]) =>
    new Promise<void>((resolve) => {
      execFile(helper, [...words], { timeout: HELPER_DEADLINE_MS, env: environment }, (error) => {
        if (error !== null && !complained)
          log.error({ reason: reasonOf(error) }, `systemd cannot be told: ${helper} failed`);
        complained = error !== null;
        resolve();
      });
    });
  return {
    tell(...words) {
      // In this order, one after the other.
      last = last.then(() => send(words));
      return last;
    },
    watchdogMs: watchdogMs(WATCHDOG_USEC, WATCHDOG_PID),
  };
}

/** Half of the limit is what sd_watchdog_enabled(3) advises; a third leaves room for a helper that is slow to start. */
const PINGS_A_LIMIT = 3;

function watchdogMs(microseconds: string | undefined, pid: string | undefined): number | null {
  const limitMs = Number(microseconds) / 1000;
  if (!(limitMs > 0) || (pid !== undefined && Number(pid) !== process.pid)) return null;
  return limitMs / PINGS_A_LIMIT;
}
