import type { Clock } from '../clock.ts';
import type { Feed } from '../config/configuration.ts';
import { reasonOf } from '../errors.ts';
import { type Audit, createAudit } from './audit.ts';
import { type Beat, createBeat } from './beat.ts';
import {
  createFeedLook,
  type FeedLook,
  type Look,
  type ReadyFile,
  type Recall,
  type WatchProblem,
} from './feedLook.ts';
import type { Trouble } from './feedMemory.ts';
import { type FolderEyes, NoAnswer, type OpenEyes, ownEyes } from './folderEyes.ts';
import { createNoticeKeeper } from './noticeKeeper.ts';
import type { Watch } from './notices.ts';
import { LARGEST_FILE_BYTES } from './open.ts';
import { createProblemLedger } from './problemLedger.ts';

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
   * @param filesWaiting settled files of all feeds that come after it
   */
  onSettled(file: ReadyFile, bytes: Buffer, filesWaiting: number): Promise<'taken' | 'not yet whole'>;
  /** Whether a path's bytes are those on record; absent: files that look the same are not read through again. */
  isAsRecorded?(file: Pick<ReadyFile, 'feed' | 'path' | 'pathBytes'>, bytes: Buffer): boolean;
  /** Once when a problem begins; again at the next look where it throws. */
  onProblem(problem: WatchProblem): void;
  onProblemEnded?(problem: WatchProblem): void;
  /** How the loop of a feed goes on: it looked, it waits for a file to be taken in, the file is done with. */
  onProgress?(feed: string, what: 'looked' | 'waits' | 'handed over'): void;
  readonly clock: Clock;
  readonly settleMs?: number;
  /** Largest file, bytes. */
  readonly largestBytes?: number;
  /** Absent: the folders are looked at in this process. */
  readonly openEyes?: OpenEyes;
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

const DEFAULT_SETTLE_MS = 2000;
/** A writer that pauses for longer inside a row will be believed. */
const LONG_SETTLE_FACTOR = 10;
const RESTLESS_MS = 3_600_000;
const SHORTEST_BREAK_MS = 100;
/** Looking takes a quarter of the time at most, however many notices come; unless it is so slow that files would wait for it. */
const BREAK_PER_LOOK = 3;
const LONGEST_BREAK_MS = 5000;
const FIRST_RETRY_MS = 5000;
const LONGEST_RETRY_MS = 600_000;

export function createWatcher(options: WatcherOptions): Watcher {
  const shared: Shared = { turns: createTurns(), readyFiles: new Map() };
  const loops = options.feeds.map((feed) => startFeed(feed, options, shared));
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

/** What the loops of the feeds have in common. */
interface Shared {
  readonly turns: Turns;
  /** Feed → files that have settled and are not done with, the one in hand included. */
  readonly readyFiles: Map<string, number>;
}

type Turns = <Result>(work: () => Promise<Result>) => Promise<Result>;

/** One at a time, in the order of asking. */
function createTurns(): Turns {
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

interface Loop extends Shared {
  readonly feed: Feed;
  readonly options: WatcherOptions;
  readonly eyes: FolderEyes;
  readonly watched: FeedLook;
  readonly beat: Beat;
  readonly audit: Audit;
  /** Path → how often taking it in failed. */
  readonly failures: Map<string, number>;
}

function startFeed(feed: Feed, options: WatcherOptions, shared: Shared): FeedLoop {
  const settleMs = options.settleMs ?? DEFAULT_SETTLE_MS;
  const settings = { settleMs, longSettleMs: settleMs * LONG_SETTLE_FACTOR, restlessMs: RESTLESS_MS };
  const beat = createBeat();
  const eyes = (options.openEyes ?? ownEyes)(feed, options.largestBytes ?? LARGEST_FILE_BYTES);
  const loop: Loop = {
    feed,
    options,
    eyes,
    watched: createFeedLook(feed, options.recall, settings, eyes.scan),
    ...shared,
    beat,
    audit: createAudit(options.clock.monotonicMs()),
    failures: new Map(),
  };
  const ledger = createProblemLedger(options.onProblem, options.onProblemEnded ?? (() => {}));
  const notices = createNoticeKeeper(feed, beat.wake, options.arm);
  let status: FeedStatus = { feed: feed.name, lastLookMs: null, files: null, moving: 0, problems: [] };

  const run = async () => {
    while (!beat.stopped) {
      const startMs = options.clock.monotonicMs();
      const look = await lookOnce(loop, startMs);
      if (beat.stopped) return;
      const lookMs = options.clock.monotonicMs() - startMs;
      ledger.update([...look.problems, ...notices.follow(look.root)]);
      options.onProgress?.(feed.name, 'looked');
      const { root, moving } = look;
      status = {
        feed: feed.name,
        lastLookMs: startMs + lookMs,
        files: root?.files ?? null,
        moving,
        problems: ledger.current(),
      };
      await handOver(look, loop, lookMs);
      if (look.ready.length === 0) await readThrough(look, loop, startMs);
      await beat.rest(restAfter(look, { lookMs, pollMs: feed.pollSeconds * 1000 }));
    }
  };
  const running = run();
  return {
    wake: beat.wake,
    status: () => status,
    stop: async () => {
      beat.stop();
      eyes.close();
      await running;
      await notices.close();
    },
  };
}

/** A look must not end the loop, whatever happens in it: a feed that is not looked at any more would be silent for ever. */
async function lookOnce({ feed, watched }: Loop, nowMs: number): Promise<Look> {
  try {
    return await watched.look(nowMs);
  } catch (error) {
    const kind = error instanceof NoAnswer ? 'no answer' : 'look failed';
    const problem: WatchProblem = { feed: feed.name, kind, path: null, message: reasonOf(error) };
    return { ready: [], moving: 0, nextReadyInMs: FIRST_RETRY_MS, root: null, files: [], problems: [problem] };
  }
}

function restAfter(look: Look, { lookMs, pollMs }: { readonly lookMs: number; readonly pollMs: number }) {
  const atLeastMs = Math.min(LONGEST_BREAK_MS, Math.max(SHORTEST_BREAK_MS, lookMs * BREAK_PER_LOOK));
  const wantedMs = look.ready.length > 0 ? atLeastMs : Math.min(pollMs, look.nextReadyInMs ?? pollMs);
  return { atLeastMs, atMostMs: Math.max(atLeastMs, wantedMs) };
}

/**
 * Breaks off for the next look after a while, so that what the backlog hides is seen; but not before it took longer than the looks do: a folder that is
 * slow to look through would otherwise never have a file handed over.
 */
async function handOver(look: Look, loop: Loop, lookMs: number): Promise<void> {
  const { beat, feed, options, readyFiles } = loop;
  const startMs = options.clock.monotonicMs();
  const atMostMs = Math.max(feed.pollSeconds * 1000, lookMs * BREAK_PER_LOOK);
  readyFiles.set(feed.name, look.ready.length);
  for (const [done, file] of look.ready.entries()) {
    if (beat.stopped || options.clock.monotonicMs() - startMs > atMostMs) return;
    await handOverOne(file, loop);
    readyFiles.set(feed.name, look.ready.length - done - 1);
  }
}

/** Files whose turn it is, against the record, while nothing new waits. */
async function readThrough(
  look: Look,
  { audit, beat, eyes, feed, options, watched }: Loop,
  nowMs: number,
): Promise<void> {
  if (look.root === null || options.isAsRecorded === undefined) return;
  for (const { path, pathBytes, stamp } of audit.due(look.files, nowMs)) {
    if (beat.stopped) return;
    if (!watched.isTaken({ path, pathBytes, stamp })) continue;
    const reading = await eyes.read({ root: look.root.folder, pathBytes, signature: stamp.signature });
    // One that changed, or may not be read, is no business of ours.
    if (reading.kind !== 'read') continue;
    const file = { feed: feed.name, path, pathBytes };
    if (!options.isAsRecorded(file, reading.bytes)) watched.doubt({ path, pathBytes, stamp });
  }
}

async function handOverOne(
  file: ReadyFile,
  { options, eyes, watched, turns, readyFiles, failures }: Loop,
): Promise<void> {
  const tryLater = (waitMs: number, trouble: Trouble | null) =>
    watched.tryLater(file, { notBeforeMs: options.clock.monotonicMs() + waitMs, trouble });
  const reading = await eyes.read({ root: file.root, pathBytes: file.pathBytes, signature: file.stamp.signature });
  if (reading.kind === 'refused') {
    watched.refused(file, reading.reason);
    return;
  }
  if (reading.kind === 'later') {
    if (reading.quiet) tryLater(0, null);
    else tryLater(FIRST_RETRY_MS, { kind: 'unreadable', message: reading.reason });
    return;
  }
  try {
    const waiting = () => [...readyFiles.values()].reduce((sum, files) => sum + files, -1);
    options.onProgress?.(file.feed, 'waits');
    const outcome = await turns(() => options.onSettled(file, reading.bytes, waiting()));
    failures.delete(file.path);
    if (outcome === 'taken') watched.taken(file, options.clock.monotonicMs());
    else watched.notYetWhole(file);
  } catch (error) {
    const times = failures.get(file.path) ?? 0;
    failures.set(file.path, times + 1);
    const waitMs = Math.min(LONGEST_RETRY_MS, FIRST_RETRY_MS * 2 ** times);
    tryLater(waitMs, { kind: 'not taken in', message: `could not be taken in: ${reasonOf(error)}` });
  } finally {
    options.onProgress?.(file.feed, 'handed over');
  }
}
