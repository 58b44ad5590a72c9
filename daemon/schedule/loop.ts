import { reasonOf } from '../errors.ts';
import type { Log } from '../log.ts';

/** Work that is done now and then again and again, a pause after each time; a failure is logged and does not end it. */
export interface Loop {
  /** Ends after the round in hand. */
  stop(): Promise<void>;
}

export function startLoop(options: {
  readonly name: string;
  readonly pauseMs: number;
  readonly work: () => Promise<void>;
  readonly log: Log;
}): Loop {
  let stopped = false;
  let endPause = () => {};
  const pause = () =>
    new Promise<void>((resolve) => {
      const timer = setTimeout(resolve, options.pauseMs);
      endPause = () => {
        clearTimeout(timer);
        resolve();
      };
    });
  const run = async () => {
    while (!stopped) {
      try {
        await options.work();
      } catch (error) {
        options.log.error({ loop: options.name, reason: reasonOf(error) }, 'a round failed; trying again');
      }
      if (!stopped) await pause();
    }
  };
  const running = run();
  return {
    stop: async () => {
      stopped = true;
      endPause();
      await running;
    },
  };
}
