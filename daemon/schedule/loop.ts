import { reasonOf } from '../errors.ts';
import type { Log } from '../log.ts';
import type { Stage } from '../progress.ts';

/** Work that is done now and then again and again, a pause after each time; a failure is logged and does not end it. */
export interface Loop {
  /** Does the next round without a pause before it. */
  now(): void;
  /** Ends after the round in hand. */
  stop(): Promise<void>;
}

export function startLoop(options: {
  readonly name: string;
  readonly pauseMs: number;
  readonly work: () => Promise<void>;
  readonly log: Log;
  /** Told after each round, also after one that failed: it will be tried again. */
  readonly stage?: Stage;
}): Loop {
  let stopped = false;
  let hurried = false;
  let endPause = () => {};
  const pause = () =>
    new Promise<void>((resolve) => {
      const timer = setTimeout(resolve, hurried ? 0 : options.pauseMs);
      hurried = false;
      endPause = () => {
        clearTimeout(timer);
        hurried = false;
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
      options.stage?.step();
      if (!stopped) await pause();
    }
  };
  const running = run();
  return {
    now() {
      hurried = true;
      endPause();
    },
    stop: async () => {
      stopped = true;
      endPause();
      await running;
    },
  };
}
