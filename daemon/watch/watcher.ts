import type { Clock } from '../clock.ts';
import type { Feed } from '../config/configuration.ts';
import { reasonOf } from '../errors.ts';
import {
  createFeedLook,
  type FeedLook,
  type Look,
  type ReadyFile,
  type Recall,
  type WatchProblem,
} from './feedLook.ts';
import { type Notices, type Watch, watchForNotices } from './notices.ts';
import { readStill } from './open.ts';

/**
 * Watches the feeds: looks at each on its own beat, sooner after a notice, and hands over what has settled, one file at a time
 * over all feeds. It only reads.
 */
export interface WatcherOptions {
  readonly feeds: readonly Feed[];
  /** What the store has of a path; decides whether a file is new. */
  readonly recall: Recall;
  /**
   * Takes a file in. `not yet whole`: offer it again once it has stood still for long (`stoodLong` then is true). What it throws
   * is reported, and the file is offered again, later each time.
   */
  onSettled(file: ReadyFile, bytes: Buffer): Promise<'taken' | 'not yet whole'>;
  /** Once when a problem begins. */
  onProblem(problem: WatchProblem): void;
  onProblemEnded?(problem: WatchProblem): void;
  readonly clock: Clock;
  readonly settleMs?: number;
  /** Largest file, bytes. */
  readonly largestBytes?: number;
  /** Swapped in tests alone. */
  readonly arm?: Watch;
}

export interface Watcher {
  /** Looks at every feed without waiting for its beat. */
  lookNow(): void;
  status(): readonly FeedStatus[];
  /** Ends after the file in hand. */
  stop(): Promise<void>;
}

/** How a feed stands, for the health page. */
export interface FeedStatus {
  readonly feed: string;
  /** Monotonic time of the last look that ended; null before the first. */
  readonly lastLookMs: number | null;
  readonly files: number | null;
  readonly moving: number;
  readonly problems: readonly WatchProblem[];
}

export const DEFAULT_SETTLE_MS = 2000;
/** A writer that pauses for longer inside a row will be believed. */
const LONG_SETTLE_FACTOR = 10;
const RESTLESS_MS = 3_600_000;
const NOTICE_GATHERING_MS = 50;
const SHORTEST_BREAK_MS = 100;
/** Looking may take a quarter of the time at most, however many notices come. */
const BREAK_PER_LOOK = 3;
const FIRST_RETRY_MS = 5000;
const LONGEST_RETRY_MS = 600_000;

export function createWatcher(options: WatcherOptions): Watcher {
  const turns = createTurns();
  const loops = options.feeds.map((feed) => startFeed(feed, options, turns));
  return {
    lookNow: () => {
      for (const loop of loops) loop.wake();
    },
    status: () => loops.map((loop) => loop.status()),
    stop: async () => {
      await Promise.all(loops.map((loop) => loop.stop()));
    },
  };
}

/** One at a time, in the order of asking. */
function createTurns(): <Result>(work: () => Promise<Result>) => Promise<Result> {
  let last: Promise<unknown> = Promise.resolve();
  return (work) => {
    const mine = last.then(work);
    last = mine.catch(() => {});
    return mine;
  };
}

interface FeedLoop {
  wake(): void;
  status(): FeedStatus;
  stop(): Promise<void>;
}

function startFeed(feed: Feed, options: WatcherOptions, turns: ReturnType<typeof createTurns>): FeedLoop {
  const { clock } = options;
  const settleMs = options.settleMs ?? DEFAULT_SETTLE_MS;
  const watched = createFeedLook(feed, options.recall, {
    settleMs,
    longSettleMs: settleMs * LONG_SETTLE_FACTOR,
    restlessMs: RESTLESS_MS,
  });
  const beat = createBeat();
  const ledger = createProblemLedger(options);
  const notices = createNoticeKeeper(feed, options, beat.wake);
  const retries = new Map<string, number>();
  let status: FeedStatus = { feed: feed.name, lastLookMs: null, files: null, moving: 0, problems: [] };

  const run = async () => {
    while (!beat.stopped) {
      const startMs = clock.monotonicMs();
      const look = await watched.look(startMs);
      const problems = notices.follow(look.rootIdentity);
      ledger.update([...look.problems, ...problems]);
      status = {
        feed: feed.name,
        lastLookMs: clock.monotonicMs(),
        files: look.files,
        moving: look.moving,
        problems: ledger.current(),
      };
      const lookMs = clock.monotonicMs() - startMs;
      await handOver(look, {
        feed,
        options,
        watched,
        turns,
        retries,
        until: () => beat.stopped || clock.monotonicMs() - startMs > feed.pollSeconds * 1000,
      });
      const breakMs = Math.max(SHORTEST_BREAK_MS, lookMs * BREAK_PER_LOOK);
      const nextMs =
        look.ready.length > 0
          ? breakMs
          : Math.min(feed.pollSeconds * 1000, look.nextReadyInMs ?? Number.POSITIVE_INFINITY);
      await beat.rest({ atLeastMs: breakMs, atMostMs: Math.max(nextMs, breakMs) });
    }
  };
  const running = run();
  return {
    wake: beat.wake,
    status: () => status,
    stop: async () => {
      beat.stop();
      await running;
      await notices.close();
    },
  };
}

interface HandOver {
  readonly feed: Feed;
  readonly options: WatcherOptions;
  readonly watched: FeedLook;
  readonly turns: ReturnType<typeof createTurns>;
  /** Path → how often taking it in failed. */
  readonly retries: Map<string, number>;
  /** True when it is time to stop or to look again, so that fresh files do not wait behind a backlog for ever. */
  until(): boolean;
}

async function handOver(look: Look, work: HandOver): Promise<void> {
  for (const file of look.ready) {
    if (work.until()) return;
    await handOverOne(file, work);
  }
}

async function handOverOne(file: ReadyFile, { feed, options, watched, turns, retries }: HandOver): Promise<void> {
  const limit = options.largestBytes === undefined ? {} : { largestBytes: options.largestBytes };
  const { pathBytes, root } = file;
  const reading = await readStill({ root, pathBytes, signature: file.stamp.signature }, limit);
  const later = (waitMs: number, problem: WatchProblem | null) =>
    watched.tryLater(file, { nowMs: options.clock.monotonicMs(), waitMs, problem });
  if (reading.kind === 'refused') return watched.refused(file, reading.reason);
  if (reading.kind === 'later') {
    const problem: WatchProblem = { feed: feed.name, kind: 'unreadable', path: file.path, message: reading.reason };
    return later(reading.quiet ? 0 : FIRST_RETRY_MS, reading.quiet ? null : problem);
  }
  try {
    const outcome = await turns(() => options.onSettled(file, reading.bytes));
    retries.delete(file.path);
    if (outcome === 'taken') watched.taken(file);
    else watched.notYetWhole(file);
  } catch (error) {
    const times = retries.get(file.path) ?? 0;
    retries.set(file.path, times + 1);
    const message = `could not be taken in: ${reasonOf(error)}`;
    later(Math.min(LONGEST_RETRY_MS, FIRST_RETRY_MS * 2 ** times), {
      feed: feed.name,
      kind: 'not taken in',
      path: file.path,
      message,
    });
  }
}

/** Sleeps between looks: at least so long, at most so long, and until somebody wakes it. */
function createBeat() {
  let stopped = false;
  let woken = false;
  let ring: () => void = () => {};
  const sleep = (ms: number, endedBy: () => boolean) =>
    new Promise<void>((resolve) => {
      if (stopped || endedBy()) return resolve();
      const timer = setTimeout(end, Math.max(0, ms));
      ring = () => {
        if (stopped || endedBy()) end();
      };
      function end() {
        clearTimeout(timer);
        resolve();
      }
    });
  return {
    get stopped() {
      return stopped;
    },
    wake: () => {
      woken = true;
      ring();
    },
    stop: () => {
      stopped = true;
      ring();
    },
    async rest({ atLeastMs, atMostMs }: { readonly atLeastMs: number; readonly atMostMs: number }) {
      await sleep(atLeastMs, () => false);
      await sleep(atMostMs - atLeastMs, () => woken);
      // Notices come in swarms: one look serves those of the next moment too.
      if (woken) await sleep(NOTICE_GATHERING_MS, () => false);
      woken = false;
    },
  };
}

/** Says once when a problem begins and once when it is over. */
function createProblemLedger(options: Pick<WatcherOptions, 'onProblem' | 'onProblemEnded'>) {
  let current = new Map<string, WatchProblem>();
  return {
    update(problems: readonly WatchProblem[]) {
      const now = new Map(
        problems.map((problem) => [JSON.stringify([problem.kind, problem.path, problem.message]), problem]),
      );
      for (const [id, problem] of now) if (!current.has(id)) options.onProblem(problem);
      for (const [id, problem] of current) if (!now.has(id)) options.onProblemEnded?.(problem);
      current = now;
    },
    current: () => [...current.values()],
  };
}

/** Holds the notices of one feed; sets them up anew when another folder stands under the feed's name. */
function createNoticeKeeper(feed: Feed, options: WatcherOptions, onNotice: () => void) {
  let notices: Notices | null = null;
  let armedFor: string | null = null;
  let failure: WatchProblem | null = null;
  return {
    follow(rootIdentity: string | null): WatchProblem[] {
      if (rootIdentity !== null && rootIdentity !== armedFor) {
        void notices?.close();
        armedFor = rootIdentity;
        failure = null;
        notices = watchForNotices(
          {
            ...feed,
            onNotice,
            onFailure: (reason) => {
              const message = `no notices of new files: ${reason}; the folder is looked at every ${feed.pollSeconds} s`;
              failure = { feed: feed.name, kind: 'no notices', path: null, message };
              onNotice();
            },
          },
          options.arm,
        );
      }
      return failure === null ? [] : [failure];
    },
    close: async () => {
      await notices?.close();
    },
  };
}
