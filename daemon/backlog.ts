import type { Clock } from './clock.ts';

/**
 * While many files wait, deciding after each would go through a pulsar's whole past again and again, because they come in no order
 * of time. So decisions are left open and taken together: when no file waits any more, and now and then before.
 */
export interface Backlog {
  readonly isEmpty: boolean;
  /** Pulsars whose decisions a file left open. */
  add(pulsars: readonly string[], file: FileTakenIn): void;
  /** Takes no decision any more, and waits for the one in hand. What is open stays open on record. */
  stop(): Promise<void>;
}

export interface FileTakenIn {
  /** It may hold what somebody must hear of soon. */
  readonly isFresh: boolean;
  /** Files that have settled and come after it. */
  readonly filesWaiting: number;
}

export interface BacklogOptions {
  readonly decide: (pulsars: readonly string[]) => Promise<void>;
  /** They stay open, and are tried again after a while. */
  readonly onFailure: (error: unknown) => void;
  readonly clock: Clock;
}

/** The next file of a swarm comes within this time. */
const QUIET_MS = 300;
/** While files go on waiting, the first decision that was left open is taken after this time; yet deciding takes a fifth of the time. */
const LONGEST_OPEN_MS = { fresh: 5000, old: 60_000 } as const;
const PAUSE_PER_DECISION_TIME = 4;
const RETRY_MS = 60_000;

export function createBacklog({ decide, onFailure, clock }: BacklogOptions): Backlog {
  const open = new Set<string>();
  let dueMs = 0;
  let lastAddedMs = 0;
  let filesWaiting = 0;
  let notBeforeMs = 0;
  let filesFirstUntilMs = 0;
  let timer: NodeJS.Timeout | undefined;
  let inHand: Promise<void> | null = null;
  let stopped = false;

  const arm = () => {
    clearTimeout(timer);
    if (stopped || inHand !== null || open.size === 0) return;
    const wantedMs = filesWaiting === 0 ? Math.min(dueMs, lastAddedMs + QUIET_MS) : Math.max(dueMs, filesFirstUntilMs);
    timer = setTimeout(start, Math.max(wantedMs, notBeforeMs) - clock.monotonicMs());
  };
  const start = () => {
    inHand = decideAll().finally(() => {
      inHand = null;
      arm();
    });
  };
  const decideAll = async () => {
    const pulsars = [...open].sort();
    open.clear();
    const startMs = clock.monotonicMs();
    try {
      await decide(pulsars);
      const endMs = clock.monotonicMs();
      filesFirstUntilMs = endMs + PAUSE_PER_DECISION_TIME * (endMs - startMs);
    } catch (error) {
      for (const pulsar of pulsars) open.add(pulsar);
      notBeforeMs = clock.monotonicMs() + RETRY_MS;
      if (!stopped) onFailure(error);
    }
  };

  return {
    get isEmpty() {
      return open.size === 0 && inHand === null;
    },
    add(pulsars, file) {
      filesWaiting = file.filesWaiting;
      if (pulsars.length > 0) {
        lastAddedMs = clock.monotonicMs();
        const thenMs = lastAddedMs + LONGEST_OPEN_MS[file.isFresh ? 'fresh' : 'old'];
        dueMs = open.size === 0 ? thenMs : Math.min(dueMs, thenMs);
        for (const pulsar of pulsars) open.add(pulsar);
      }
      arm();
    },
    async stop() {
      stopped = true;
      clearTimeout(timer);
      await inHand;
    },
  };
}
