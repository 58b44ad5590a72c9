import { systemClock } from './clock.ts';
import type { Configuration } from './config/configuration.ts';
import { EXIT, OperatorError, reasonOf } from './errors.ts';
import type { Log } from './log.ts';
import { loadOrders, openRecord, problemLine } from './opening.ts';
import { rereadConfiguration } from './reload.ts';
import { createVerdictTokens } from './review/verdictToken.ts';
import type { ServiceManager } from './serviceManager.ts';
import { startShift } from './shift.ts';
import type { Summons } from './summons.ts';

/**
 * The daemon from its start to its end. The record is held throughout; everything else works for one configuration, in a shift that gives way to
 * the next when the operator has a new one taken up.
 */
export interface WatchOptions {
  readonly configFile: string;
  readonly log: Log;
  /** Aborted by a signal: finish what is in hand, then end. */
  readonly stop: AbortSignal;
  /** Given by a signal: read the configuration again. */
  readonly reload: Summons;
  readonly manager: ServiceManager;
  /** For the person who started it. */
  readonly say: (line: string) => void;
}

/** Resolves once stopped; rejects when it cannot start, or when the storage fails for good. */
export async function runWatch(options: WatchOptions): Promise<void> {
  const { configFile, log, manager } = options;
  const { configuration, warnings } = loadOrders(configFile);
  for (const complaint of warnings) log.warn(problemLine(complaint));
  const store = openRecord(configuration, 'daemon');
  const failure = failureOnce();
  const parts = {
    ...options,
    store,
    clock: systemClock,
    tokens: createVerdictTokens(),
    startedAt: systemClock.now(),
    onFatal: failure.raise,
  };
  try {
    let orders: Configuration | null = configuration;
    while (orders !== null) {
      const shift = await startShift(parts, orders);
      try {
        orders = await Promise.race([nextOrders(options, orders, shift.onBadReload), failure.raised]);
        log.info(orders === null ? 'stopping' : 'taking up the new configuration');
        if (orders === null) void manager.tell('STOPPING=1', 'STATUS=stopping');
      } finally {
        await shift.end();
      }
    }
  } finally {
    store.close();
  }
  log.info('stopped');
}

/** Waits for a configuration to be taken up; null: for the end. */
async function nextOrders(
  { stop, reload, manager, log }: WatchOptions,
  present: Configuration,
  onBad: (problems: readonly string[]) => Promise<void>,
): Promise<Configuration | null> {
  for (;;) {
    await Promise.race([aborted(stop), reload.given()]);
    if (stop.aborted) return null;
    void manager.tell('RELOADING=1');
    const read = rereadConfiguration(present);
    if ('configuration' in read) {
      for (const warning of read.warnings) log.warn(warning);
      return read.configuration;
    }
    for (const problem of read.problems) log.error({ problem }, 'the new configuration is not taken up');
    void manager.tell('READY=1');
    await onBad(read.problems).catch((error) => log.error({ reason: reasonOf(error) }, 'nobody could be told of it'));
  }
}

function aborted(signal: AbortSignal): Promise<void> {
  if (signal.aborted) return Promise.resolve();
  return new Promise((resolve) => signal.addEventListener('abort', () => resolve(), { once: true }));
}

/** The first failure that the daemon cannot go on after. */
function failureOnce(): { readonly raised: Promise<never>; readonly raise: (error: unknown) => void } {
  let raise: (error: unknown) => void = () => {};
  const raised = new Promise<never>((_, reject) => {
    raise = (error) =>
      reject(
        new OperatorError(`the record failed: ${reasonOf(error)}`, {
          exitCode: EXIT.workFailed,
          advice: 'nothing more was written; check the disk, then start again',
          cause: error,
        }),
      );
  });
  // It may come while the daemon is still starting or ending, when nobody waits for it.
  raised.catch(() => {});
  return { raised, raise };
}
