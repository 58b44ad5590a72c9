import { runWatch } from '../lifecycle.ts';
import { createLog } from '../log.ts';
import type { Terminal } from './terminal.ts';

/** `watch`: the daemon, until a signal ends it. A second signal ends it at once; that loses nothing. */
export async function watch(terminal: Terminal, options: { readonly config: string }): Promise<void> {
  const stop = new AbortController();
  const onSignal = (signal: NodeJS.Signals) => {
    if (stop.signal.aborted) process.kill(process.pid, 'SIGKILL');
    stop.abort(signal);
  };
  for (const signal of ['SIGTERM', 'SIGINT', 'SIGHUP'] as const) process.on(signal, onSignal);
  const log = createLog();
  await runWatch({ configFile: options.config, log, stop: stop.signal, say: (line) => terminal.out(line) });
  // A mail server that does not answer may still hold a connection open; its message goes again at the next start.
  setTimeout(() => process.exit(), LAST_GRACE_MS).unref();
}

const LAST_GRACE_MS = 500;
