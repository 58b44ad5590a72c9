/** Sleeps between two looks: at least so long, at most so long, and until somebody wakes it. */
export interface Beat {
  readonly stopped: boolean;
  wake(): void;
  stop(): void;
  rest(times: { readonly atLeastMs: number; readonly atMostMs: number }): Promise<void>;
}

/** Notices come in swarms: one look serves those of the next moment too. */
const GATHERING_MS = 50;

export function createBeat(): Beat {
  let stopped = false;
  let woken = false;
  let ring = () => {};

  const sleep = (ms: number, isEnough: () => boolean) =>
    new Promise<void>((resolve) => {
      const end = () => {
        clearTimeout(timer);
        resolve();
      };
      const timer = setTimeout(end, Math.max(0, ms));
      ring = () => {
        if (stopped || isEnough()) end();
      };
      ring();
    });

  return {
    get stopped() {
      return stopped;
    },
    wake() {
      woken = true;
      ring();
    },
    stop() {
      stopped = true;
      ring();
    },
    async rest({ atLeastMs, atMostMs }) {
      await sleep(atLeastMs, () => false);
      await sleep(atMostMs - atLeastMs, () => woken);
      if (woken) await sleep(GATHERING_MS, () => false);
      woken = false;
    },
  };
}
