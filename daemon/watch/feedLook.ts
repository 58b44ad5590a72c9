import type { Feed } from '../config/configuration.ts';
import { type FoundFile, type Scan, scanFolder } from './scan.ts';
import { isSettled, type Stillness, stillness } from './settle.ts';

/**
 * One look at a feed after the other: which files are new or changed and stand still, which still move, and what is wrong just
 * now. Only what the store has not taken in yet is remembered here, so that a restart forgets nothing that matters.
 */
export interface LookSettings {
  /** No change for this long: the file is whole. */
  readonly settleMs: number;
  /** For files that look cut: without an end of line, or shorter than before. */
  readonly longSettleMs: number;
  /** A file that moves for longer is reported. */
  readonly restlessMs: number;
}

/** The last content of a path that was taken in, as the store has it. */
export interface TakenFile {
  readonly signature: string;
  readonly bytes: number;
}

export type Recall = (feed: string, file: { readonly path: string; readonly pathBytes: Buffer }) => TakenFile | null;

export interface ReadyFile extends FoundFile {
  readonly feed: string;
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
    | 'unreadable'
    | 'shrunk'
    | 'restless'
    | 'not taken in'
    | 'no notices';
  /** Null: the feed as a whole. */
  readonly path: string | null;
  readonly message: string;
}

export interface Look {
  /** Oldest first, by modification time and then by name. */
  readonly ready: readonly ReadyFile[];
  /** Files that are watched until they stand still. */
  readonly moving: number;
  /** Files in the folder; null while it is gone. */
  readonly files: number | null;
  /** When the next file may be ready; null: none waits. */
  readonly nextReadyInMs: number | null;
  readonly rootIdentity: string | null;
  readonly problems: readonly WatchProblem[];
}

export interface FeedLook {
  look(nowMs: number): Promise<Look>;
  /** The store has it. */
  taken(file: FoundFile): void;
  /** It cannot be taken in this form: not offered again until it changes. */
  refused(file: FoundFile, reason: string): void;
  /** Offered again after standing still for long. */
  notYetWhole(file: FoundFile): void;
  /** Offered again after `waitMs`. */
  tryLater(
    file: FoundFile,
    trouble: { readonly nowMs: number; readonly waitMs: number; readonly problem: WatchProblem | null },
  ): void;
}

/** A file that is new or changed and not taken in yet. */
interface Waiting {
  still: Stillness;
  readonly firstSeenMs: number;
  needsLong: boolean;
  shrunkFrom: number | null;
  notBeforeMs: number;
  problem: WatchProblem | null;
}

export function createFeedLook(
  feed: Pick<Feed, 'name' | 'folder' | 'recursive'>,
  recall: Recall,
  settings: LookSettings,
): FeedLook {
  const waiting = new Map<string, Waiting>();
  /** Path → signature of what is settled: taken in, or refused with the problem. */
  const settled = new Map<string, { readonly signature: string; readonly problem: WatchProblem | null }>();
  let last: { readonly identity: string; readonly files: number } | null = null;
  let emptied: WatchProblem | null = null;

  const problem = (kind: WatchProblem['kind'], path: string | null, message: string): WatchProblem => ({
    feed: feed.name,
    kind,
    path,
    message,
  });

  return {
    async look(nowMs) {
      const scan = await scanFolder(feed.folder, { recursive: feed.recursive });
      if (scan.kind === 'root gone') {
        // Nothing is forgotten: the files may come back with the disk.
        const gone = problem(
          'root gone',
          null,
          `the feed's folder ${feed.folder} ${scan.reason}; nothing can be read until it is back`,
        );
        return {
          ready: [],
          moving: waiting.size,
          files: null,
          nextReadyInMs: null,
          rootIdentity: null,
          problems: [gone],
        };
      }
      noteRoot(scan);
      forgetAllBut(new Set(scan.files.map(({ path }) => path)));
      const ready: ReadyFile[] = [];
      const problems = scan.refused.map(({ path, reason }) => problem('refused', path, reason));
      if (emptied !== null) problems.push(emptied);
      let nextReadyInMs: number | null = null;
      for (const file of scan.files) {
        const known = settledAs(file);
        if (known !== null) {
          if (known.problem !== null) problems.push(known.problem);
          continue;
        }
        const entry = waitingFor(file, nowMs);
        problems.push(...troublesOf(file, entry, nowMs));
        const neededMs = entry.needsLong ? settings.longSettleMs : settings.settleMs;
        if (nowMs >= entry.notBeforeMs && isSettled(entry.still, nowMs, neededMs)) {
          const stoodLong = isSettled(entry.still, nowMs, settings.longSettleMs);
          ready.push({ ...file, feed: feed.name, root: scan.root, stoodLong });
        } else {
          const inMs = Math.max(entry.notBeforeMs - nowMs, entry.still.sinceMs + neededMs - nowMs, 1);
          nextReadyInMs = Math.min(nextReadyInMs ?? inMs, inMs);
        }
      }
      ready.sort(oldestFirst);
      return {
        ready,
        moving: waiting.size,
        files: scan.files.length,
        nextReadyInMs,
        rootIdentity: scan.rootIdentity,
        problems,
      };
    },
    taken({ path, stamp }) {
      waiting.delete(path);
      settled.set(path, { signature: stamp.signature, problem: null });
    },
    refused({ path, stamp }, reason) {
      waiting.delete(path);
      settled.set(path, { signature: stamp.signature, problem: problem('refused', path, reason) });
    },
    notYetWhole({ path }) {
      const entry = waiting.get(path);
      if (entry !== undefined) entry.needsLong = true;
    },
    tryLater({ path }, trouble) {
      const entry = waiting.get(path);
      if (entry === undefined) return;
      entry.notBeforeMs = trouble.nowMs + trouble.waitMs;
      entry.problem = trouble.problem;
    },
  };

  /** Another folder under the name, and nothing in it: more likely a lost mount than a cleared feed. */
  function noteRoot({ rootIdentity: identity, files }: Extract<Scan, { kind: 'listed' }>): void {
    if (files.length > 0) emptied = null;
    else if (last !== null && last.identity !== identity && last.files > 0) {
      const message = `another, empty folder stands in place of ${feed.folder}, which held ${last.files} files; is a disk not mounted?`;
      emptied = problem('root emptied', null, message);
    }
    last = { identity, files: files.length };
  }

  function forgetAllBut(present: ReadonlySet<string>): void {
    for (const path of waiting.keys()) if (!present.has(path)) waiting.delete(path);
    for (const path of settled.keys()) if (!present.has(path)) settled.delete(path);
  }

  function settledAs(file: FoundFile): { readonly problem: WatchProblem | null } | null {
    const known = settled.get(file.path);
    if (known?.signature === file.stamp.signature) return known;
    if (waiting.get(file.path)?.still.signature === file.stamp.signature) return null;
    if (recall(feed.name, file)?.signature !== file.stamp.signature) return null;
    settled.set(file.path, { signature: file.stamp.signature, problem: null });
    waiting.delete(file.path);
    return { problem: null };
  }

  function waitingFor(file: FoundFile, nowMs: number): Waiting {
    const { signature, bytes } = file.stamp;
    const earlier = waiting.get(file.path);
    if (earlier?.still.signature === signature) return earlier;
    const before = recall(feed.name, file);
    const shrunkFrom = before !== null && bytes < before.bytes ? before.bytes : null;
    const entry: Waiting = {
      still: stillness(earlier?.still, signature, nowMs),
      firstSeenMs: earlier?.firstSeenMs ?? nowMs,
      needsLong: shrunkFrom !== null,
      shrunkFrom,
      notBeforeMs: 0,
      problem: null,
    };
    waiting.set(file.path, entry);
    return entry;
  }

  function troublesOf(file: FoundFile, entry: Waiting, nowMs: number): WatchProblem[] {
    const troubles = entry.problem === null ? [] : [entry.problem];
    if (entry.shrunkFrom !== null) {
      const message = `is shorter than when it was read (${entry.shrunkFrom} bytes then); it is read again once it has stood still for long`;
      troubles.push(problem('shrunk', file.path, message));
    }
    if (nowMs - entry.firstSeenMs > settings.restlessMs && entry.problem === null) {
      troubles.push(problem('restless', file.path, 'has not stopped changing; it is read once it stands still'));
    }
    return troubles;
  }
}

function oldestFirst(a: FoundFile, b: FoundFile): number {
  return a.stamp.modifiedMs - b.stamp.modifiedMs || Buffer.compare(a.pathBytes, b.pathBytes);
}
