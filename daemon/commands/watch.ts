import { EXIT } from '../errors.ts';
import { runWatch } from '../lifecycle.ts';
import { createLog, type Log } from '../log.ts';
import { createServiceManager } from '../serviceManager.ts';
import { createSummons } from '../summons.ts';
import type { Terminal } from './terminal.ts';

/**
 * `watch`: the daemon, until SIGTERM or SIGINT ends it. A second one ends it at once; that loses nothing. SIGHUP has the configuration read again;
 * but a daemon that somebody started in a terminal ends with it.
 */
export async function watch(terminal: Terminal, options: { readonly config: string }): Promise<void> {
  const stop = new AbortController();
  const reload = createSummons();
  const onSignal = (signal: NodeJS.Signals) => {
    if (stop.signal.aborted) process.kill(process.pid, 'SIGKILL');
    stop.abort(signal);
  };
  for (const signal of ['SIGTERM', 'SIGINT'] as const) process.on(signal, onSignal);
  process.on('SIGHUP', process.stdin.isTTY ? onSignal : () => reload.give());
  const log = createLog();
  endOnFault(log);
  const manager = createServiceManager({ environment: process.env, log });
  const say = (line: string) => terminal.out(line);
  await runWatch({ configFile: options.config, log, stop: stop.signal, reload, manager, say });
  // A mail server that does not answer may still hold a connection open; its message goes again at the next start.
  setTimeout(() => process.exit(), LAST_GRACE_MS).unref();
}

const LAST_GRACE_MS = 500;

/** After an error that nobody awaited nothing can be relied on. The record is whole at any time; the service manager starts anew. */
function endOnFault(log: Log): void {
  process.on('uncaughtException', (error) => {
    log.fatal({ err: error }, 'a fault of the program: ending');
    process.exit(EXIT.workFailed);
  });
}
