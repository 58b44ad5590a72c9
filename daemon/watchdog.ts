import type { Pulse } from './health.ts';
import type { Log } from './log.ts';
import { type Loop, startLoop } from './schedule/loop.ts';
import type { ServiceManager } from './serviceManager.ts';

/**
 * The link to systemd while the daemon runs: the status line, and the sign of life only while every stage makes progress. When one does not, the
 * sign is withheld, and systemd starts the daemon again.
 */
const STATUS_EVERY_MS = 60_000;

export function startWatchdog(parts: {
  readonly manager: ServiceManager;
  readonly lateStages: () => readonly string[];
  readonly pulse: () => Pulse;
  readonly log: Log;
}): Loop {
  const { manager, lateStages, pulse, log } = parts;
  let complainedOf = '';
  return startLoop({
    name: 'watchdog',
    pauseMs: manager.watchdogMs ?? STATUS_EVERY_MS,
    log,
    async work() {
      const late = lateStages();
      const { stopped, mailBlocked } = pulse();
      const troubles = [...stopped, ...(mailBlocked ? ['mail does not leave'] : [])];
      const status = `STATUS=${troubles.length === 0 ? 'watching' : troubles.join('; ')}`;
      if (late.length > 0 && late.join() !== complainedOf) {
        log.error({ stages: late }, 'no progress: systemd is not told that the watch is alive');
      }
      complainedOf = late.join();
      const alive = late.length === 0 && manager.watchdogMs !== null ? ['WATCHDOG=1'] : [];
      await manager.tell(...alive, status);
    },
  });
}
