import type { Clock } from './clock.ts';

/**
 * While many files wait, deciding after each would go through a pulsar's whole past again and again, because they come in no order
 * of time. So decisions are left open and taken together: when no file waits any more, and now and then before.
 */
export interface Backlog {
  readonly isEmpty: boolean;
  /** Pulsars whose decisions a file left open, and how many files wait behind it. */
  add(pulsars: readonly string[], filesWaiting: number): void;
  /** Takes no decision any more, and waits for the one in hand. What is open stays open on record. */
  stop(): Promise<void>;
}

export interface BacklogOptions {
  readonly decide: (pulsars: readonly string[]) => Promise<void>;
  /** They stay open, and are tried again after a while. */
  readonly onFailure: (error: unknown) => void;
  readonly clock: Clock;
}

/** The next file of a swarm comes within this time. */
const QUIET_MS = 300;
/** While files go on waiting: so long after the first decision was left open, and never more than a fifth of the time. */
const LONGEST_OPEN_MS = 5000;
const FILES_PER_DECISION_TIME = 4;
const RETRY_MS = 60_000;

export function createBacklog({ decide, onFailure, clock }: BacklogOptions): Backlog {
  const open = new Set<string>();
  let openSinceMs = 0;
  let notBeforeMs = 0;
  let lastTookMs = 0;
  let timer: NodeJS.Timeout | undefined;
  let inHand: Promise<void> | null = null;
  let stopped = false;

  const arm = (dueMs: number) => {
    clearTimeout(timer);
    if (!stopped && inHand === null) timer = setTimeout(start, Math.max(0, dueMs - clock.monotonicMs()));
  };
  const start = () => {
    inHand = decideAll().finally(() => {
      inHand = null;
      if (open.size > 0) arm(Math.max(notBeforeMs, openSinceMs + LONGEST_OPEN_MS));
    });
  };
  const decideAll = async () => {
    const pulsars = [...open].sort();
    open.clear();
    const startMs = clock.monotonicMs();
    try {
      await decide(pulsars);
      notBeforeMs = 0;
    } catch (error) {
      for (const pulsar of pulsars) open.add(pulsar);
      notBeforeMs = clock.monotonicMs() + RETRY_MS;
      onFailure(error);
    }
    lastTookMs = clock.monotonicMs() - startMs;
    openSinceMs = clock.monotonicMs();
  };

  return {
    get isEmpty() {
      return open.size === 0 && inHand === null;
    },
    add(pulsars, filesWaiting) {
      const nowMs = clock.monotonicMs();
      if (open.size === 0) openSinceMs = Math.max(openSinceMs, nowMs);
      for (const pulsar of pulsars) open.add(pulsar);
      if (open.size === 0) return;
      const patienceMs = Math.max(LONGEST_OPEN_MS, FILES_PER_DECISION_TIME * lastTookMs);
      arm(Math.max(notBeforeMs, filesWaiting === 0 ? nowMs + QUIET_MS : openSinceMs + patienceMs));
    },
    async stop() {
      stopped = true;
      clearTimeout(timer);
      await inHand;
    },
  };
}
