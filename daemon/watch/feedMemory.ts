import type { FoundFile, Scan } from './scan.ts';
import { type Stillness, stillness } from './settle.ts';

/**
 * What the watcher remembers of one feed between two looks: the files that wait until they stand still, and those that are done
 * with. All of it can be lost: after a restart the store says what was taken in, and stillness is measured anew.
 */
export interface FeedMemory {
  /** By path. */
  readonly waiting: Map<string, WaitingFile>;
  /** By path: taken in, or refused for the reason given. */
  readonly settled: Map<string, SettledFile>;
  root: { readonly identity: string; readonly files: number } | null;
  /** Set while an empty folder stands where another held this many files. */
  emptiedFrom: number | null;
}

export interface SettledFile {
  readonly signature: string;
  readonly refusal: string | null;
  /** From this monotonic time on the store is asked again, because rows of it wait for their time; null: it need not be. */
  readonly askAgainMs: number | null;
}

/** A file that is new or changed and not taken in yet. */
export interface WaitingFile {
  readonly still: Stillness;
  readonly firstSeenMs: number;
  /** Size of the content that was taken in before, when the file is shorter now. */
  readonly shrunkFrom: number | null;
  /** It looks cut: it must stand still for longer. */
  needsLong: boolean;
  notBeforeMs: number;
  /** Why the last attempt failed. */
  trouble: Trouble | null;
}

export interface Trouble {
  readonly kind: 'unreadable' | 'not taken in';
  readonly message: string;
}

/** The last content of a path that was taken in, as the store has it. */
export interface TakenFile {
  readonly signature: string;
  readonly bytes: number;
  /** Rows of it wait for their time: the store may want it again though it has not changed. */
  readonly isHeld?: boolean;
}

export function createFeedMemory(): FeedMemory {
  return { waiting: new Map(), settled: new Map(), root: null, emptiedFrom: null };
}

export function forgetAllBut(memory: FeedMemory, files: readonly FoundFile[]): void {
  const present = new Set(files.map(({ path }) => path));
  for (const path of memory.waiting.keys()) if (!present.has(path)) memory.waiting.delete(path);
  for (const path of memory.settled.keys()) if (!present.has(path)) memory.settled.delete(path);
}

/** Another folder under the same name with nothing in it is more likely a lost mount than a cleared feed. */
export function noteRoot(
  memory: FeedMemory,
  { rootIdentity: identity, files }: Extract<Scan, { kind: 'listed' }>,
): void {
  const { root } = memory;
  if (files.length > 0) memory.emptiedFrom = null;
  else if (root !== null && root.identity !== identity && root.files > 0) memory.emptiedFrom = root.files;
  memory.root = { identity, files: files.length };
}

export function settle(
  memory: FeedMemory,
  { path, stamp }: FoundFile,
  how: Omit<SettledFile, 'signature'> = { refusal: null, askAgainMs: null },
): void {
  memory.waiting.delete(path);
  memory.settled.set(path, { signature: stamp.signature, ...how });
}

/** The file's entry among those that wait, made or begun anew when it changed since the last look. */
export function waitingEntry(
  memory: FeedMemory,
  file: FoundFile,
  { before, nowMs }: { readonly before: TakenFile | null; readonly nowMs: number },
): WaitingFile {
  const { signature, bytes } = file.stamp;
  const earlier = memory.waiting.get(file.path);
  const shrunkFrom = before !== null && bytes < before.bytes ? before.bytes : null;
  const entry: WaitingFile = {
    still: stillness(earlier?.still, signature, nowMs),
    firstSeenMs: earlier?.firstSeenMs ?? nowMs,
    shrunkFrom,
    needsLong: shrunkFrom !== null,
    notBeforeMs: 0,
    trouble: null,
  };
  memory.waiting.set(file.path, entry);
  return entry;
}
