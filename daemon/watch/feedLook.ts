import type { Feed } from '../config/configuration.ts';
import {
  createFeedMemory,
  type FeedMemory,
  forgetAllBut,
  noteRoot,
  settle,
  type TakenFile,
  type Trouble,
  type WaitingFile,
  waitingEntry,
} from './feedMemory.ts';
import { type FoundFile, type Scan, scanFolder } from './scan.ts';
import { isSettled } from './settle.ts';

/** One look at a feed after the other: which files are new or changed and stand still, which still move, what is wrong now. */
export interface FeedLook {
  look(nowMs: number): Promise<Look>;
  /** The store has it. */
  taken(file: FoundFile, nowMs: number): void;
  /** It cannot be taken in this form: not offered again until it changes. */
  refused(file: FoundFile, reason: string): void;
  /** Offered again after standing still for long. */
  notYetWhole(file: FoundFile): void;
  /** Taken in, and as it was then by length and times. */
  isTaken(file: FoundFile): boolean;
  /** Its bytes are not those that were taken in, though it looks the same: offered again like a file that changed. */
  doubt(file: FoundFile): void;
  /** Offered again from `notBeforeMs` on. */
  tryLater(file: FoundFile, again: { readonly notBeforeMs: number; readonly trouble: Trouble | null }): void;
}

export interface Look {
  /** Oldest first, by modification time and then by name. */
  readonly ready: readonly ReadyFile[];
  /** Files that wait until they stand still. */
  readonly moving: number;
  /** When the next of them may be ready; null: none waits. */
  readonly nextReadyInMs: number | null;
  /** Null while the folder is gone. */
  readonly root: { readonly folder: Buffer; readonly identity: string; readonly files: number } | null;
  readonly files: readonly FoundFile[];
  readonly problems: readonly WatchProblem[];
}

export interface ReadyFile extends FoundFile {
  readonly feed: string;
  /** The feed's folder, links resolved. */
  readonly root: Buffer;
  /** True once the file has stood still for `longSettleMs`. */
  readonly stoodLong: boolean;
}

export interface WatchProblem {
  readonly feed: string;
  readonly kind:
    | 'root gone'
    | 'root emptied'
    | 'refused'
    | 'shrunk'
    | 'restless'
    | 'no notices'
    | 'look failed'
    | 'no answer'
    | Trouble['kind'];
  /** Null: the feed as a whole. */
  readonly path: string | null;
  /** The bytes of `path`, where it names one thing in the folder. */
  readonly pathBytes?: Buffer;
  readonly message: string;
}

export interface LookSettings {
  /** No change for this long: the file is whole. */
  readonly settleMs: number;
  /** For files that look cut: without an end of line, or shorter than before. */
  readonly longSettleMs: number;
  /** A file that moves for longer is reported. */
  readonly restlessMs: number;
}

/** What the store has of a path; null: nothing. */
export type Recall = (feed: string, file: FoundFile) => TakenFile | null;

const ASK_AGAIN_MS = 300_000;

type WatchedFeed = Pick<Feed, 'name' | 'folder' | 'recursive'>;

export function createFeedLook(
  feed: WatchedFeed,
  recall: Recall,
  settings: LookSettings,
  scanned: () => Promise<Scan> = () => scanFolder(feed.folder, { recursive: feed.recursive }),
): FeedLook {
  const memory = createFeedMemory();
  return {
    async look(nowMs) {
      const scan = await scanned();
      return scan.kind === 'listed'
        ? sort(scan, { feed, memory, recall, settings, nowMs })
        : gone(feed, memory, scan.reason);
    },
    taken: (file, nowMs) => settleAs(memory, file, { taken: recall(feed.name, file), nowMs }),
    refused: (file, reason) => settle(memory, file, { refusal: reason, askAgainMs: null }),
    notYetWhole({ path }) {
      const entry = memory.waiting.get(path);
      if (entry !== undefined) entry.needsLong = true;
    },
    isTaken({ path, stamp }) {
      const settled = memory.settled.get(path);
      return settled?.signature === stamp.signature && settled.refusal === null;
    },
    doubt: ({ path }) => void memory.settled.delete(path),
    tryLater({ path }, again) {
      const entry = memory.waiting.get(path);
      if (entry !== undefined) Object.assign(entry, again);
    },
  };
}

/** Nothing is forgotten: the files may come back with the disk. */
function gone(feed: WatchedFeed, memory: FeedMemory, reason: string): Look {
  const message = `the folder ${feed.folder} ${reason}; nothing can be read until it is back`;
  const problem: WatchProblem = { feed: feed.name, kind: 'root gone', path: null, message };
  return { ready: [], moving: memory.waiting.size, nextReadyInMs: null, root: null, files: [], problems: [problem] };
}

type Named = Pick<FoundFile, 'path' | 'pathBytes'>;

interface Looking {
  readonly feed: WatchedFeed;
  readonly memory: FeedMemory;
  readonly recall: Recall;
  readonly settings: LookSettings;
  readonly nowMs: number;
}

/** Sorts what the scan found into what is done with, what waits and what is ready. */
function sort(scan: Extract<Scan, { kind: 'listed' }>, looking: Looking): Look {
  const { feed, memory, settings, nowMs } = looking;
  noteRoot(memory, scan);
  forgetAllBut(memory, scan.files);
  const ready: ReadyFile[] = [];
  const problems: WatchProblem[] = [];
  const report = (kind: WatchProblem['kind'], of: Named, message: string) =>
    problems.push({ feed: feed.name, kind, path: of.path, pathBytes: of.pathBytes, message });
  if (memory.emptiedFrom !== null) {
    const message = emptiedMessage(feed, memory.emptiedFrom);
    problems.push({ feed: feed.name, kind: 'root emptied', path: null, message });
  }
  for (const refused of scan.refused) report('refused', refused, refused.reason);

  let nextReadyInMs = Number.POSITIVE_INFINITY;
  for (const file of scan.files) {
    const entry = entryOf(file, looking);
    if ('refusal' in entry) {
      if (entry.refusal !== null) report('refused', file, entry.refusal);
      continue;
    }
    for (const { kind, message } of troublesOf(entry, looking)) report(kind, file, message);
    const neededMs = entry.needsLong ? settings.longSettleMs : settings.settleMs;
    if (nowMs >= entry.notBeforeMs && isSettled(entry.still, nowMs, neededMs)) {
      const stoodLong = isSettled(entry.still, nowMs, settings.longSettleMs);
      ready.push({ ...file, feed: feed.name, root: scan.root, stoodLong });
    } else {
      const readyAtMs = Math.max(entry.notBeforeMs, entry.still.sinceMs + neededMs);
      nextReadyInMs = Math.min(nextReadyInMs, Math.max(1, readyAtMs - nowMs));
    }
  }
  return {
    ready: ready.sort(oldestFirst),
    moving: memory.waiting.size,
    nextReadyInMs: Number.isFinite(nextReadyInMs) ? nextReadyInMs : null,
    root: { folder: scan.root, identity: scan.rootIdentity, files: scan.files.length },
    files: scan.files,
    problems,
  };
}

/** The file as one that is done with, or as one that waits. The store is asked once for each new content. */
function entryOf(
  file: FoundFile,
  { feed, memory, recall, nowMs }: Looking,
): WaitingFile | { readonly refusal: string | null } {
  const { signature } = file.stamp;
  const settled = memory.settled.get(file.path);
  if (settled?.signature === signature && nowMs < (settled.askAgainMs ?? Number.POSITIVE_INFINITY)) return settled;
  const waiting = memory.waiting.get(file.path);
  if (waiting?.still.signature === signature) return waiting;
  const before = recall(feed.name, file);
  if (before?.signature !== signature) return waitingEntry(memory, file, { before, nowMs });
  settleAs(memory, file, { taken: before, nowMs });
  return { refusal: null };
}

function settleAs(
  memory: FeedMemory,
  file: FoundFile,
  { taken, nowMs }: { readonly taken: TakenFile | null; readonly nowMs: number },
): void {
  settle(memory, file, { refusal: null, askAgainMs: taken?.isHeld ? nowMs + ASK_AGAIN_MS : null });
}

function troublesOf(
  entry: WaitingFile,
  { settings, nowMs }: Looking,
): { kind: WatchProblem['kind']; message: string }[] {
  const troubles: { kind: WatchProblem['kind']; message: string }[] = entry.trouble === null ? [] : [entry.trouble];
  if (entry.shrunkFrom !== null) {
    const message = `is shorter than the ${entry.shrunkFrom} bytes that were read before; it is read once it has stood still for long`;
    troubles.push({ kind: 'shrunk', message });
  }
  if (nowMs - entry.firstSeenMs > settings.restlessMs && entry.trouble === null) {
    troubles.push({ kind: 'restless', message: 'does not stop changing; it is read once it stands still' });
  }
  return troubles;
}

function emptiedMessage(feed: WatchedFeed, files: number): string {
  return `an empty folder stands in place of ${feed.folder}, which held ${files} files; is a disk not mounted?`;
}

function oldestFirst(a: FoundFile, b: FoundFile): number {
  return a.stamp.modifiedMs - b.stamp.modifiedMs || Buffer.compare(a.pathBytes, b.pathBytes);
}
