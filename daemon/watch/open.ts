import { type BigIntStats, constants } from 'node:fs';
import { type FileHandle, open, readlink, realpath } from 'node:fs/promises';
import { joinBytes } from './fileName.ts';
import { isGone, reasonFor, refusalOf } from './scan.ts';
import { stampOf } from './signature.ts';

/**
 * Reads a file that others may swap, grow or replace while we look: never blocks on a pipe, never follows a link, never reads
 * more than the limit, and hands out bytes only when the file stood still from the scan to the end of the reading.
 */
export type Reading =
  | { readonly kind: 'read'; readonly bytes: Buffer }
  /** Not now: it changed or vanished, or the system said no for the moment. */
  | { readonly kind: 'later'; readonly reason: string; readonly quiet: boolean }
  /** Not in this form. */
  | { readonly kind: 'refused'; readonly reason: string };

export interface Wanted {
  /** The feed's folder, links resolved. */
  readonly root: Buffer;
  readonly pathBytes: Buffer;
  /** As the scan saw it; the file that is opened must be that one. */
  readonly signature: string;
}

export const LARGEST_FILE_BYTES = 64 * 1024 * 1024;
const FLAGS = constants.O_RDONLY | constants.O_NOFOLLOW | constants.O_NONBLOCK | constants.O_NOCTTY;

const CHANGED: Reading = { kind: 'later', reason: 'changed while it was being read', quiet: true };
const VANISHED: Reading = { kind: 'later', reason: 'is gone', quiet: true };

export async function readStill(wanted: Wanted, { largestBytes = LARGEST_FILE_BYTES } = {}): Promise<Reading> {
  const path = joinBytes(wanted.root, wanted.pathBytes);
  let handle: FileHandle;
  try {
    handle = await open(path, FLAGS);
  } catch (error) {
    if (isGone(error)) return VANISHED;
    if ((error as NodeJS.ErrnoException).code === 'ELOOP') return { kind: 'refused', reason: reasonFor(error) };
    // ENXIO: a socket or a pipe without a writer.
    if ((error as NodeJS.ErrnoException).code === 'ENXIO') return { kind: 'refused', reason: 'is not a regular file' };
    return { kind: 'later', reason: reasonFor(error), quiet: false };
  }
  try {
    return await readHandle(handle, { ...wanted, path, largestBytes });
  } catch (error) {
    return { kind: 'later', reason: reasonFor(error), quiet: false };
  } finally {
    await handle.close();
  }
}

async function readHandle(
  handle: FileHandle,
  wanted: Wanted & { readonly path: Buffer; readonly largestBytes: number },
): Promise<Reading> {
  const before = await handle.stat({ bigint: true });
  const reason = refusalOf(before) ?? formRefusal(before, wanted.largestBytes);
  if (reason !== null) return { kind: 'refused', reason };
  if (stampOf(before).signature !== wanted.signature) return CHANGED;
  const opened = await whereOpened(handle, wanted.path);
  if (opened === null) return VANISHED;
  if (!opened.equals(wanted.path)) {
    return opened.includes(' (deleted)')
      ? CHANGED
      : { kind: 'refused', reason: 'lies behind a symbolic link; links are not followed' };
  }
  const bytes = await readAtMost(handle, Number(before.size));
  const after = await handle.stat({ bigint: true });
  const still = bytes.length === Number(before.size) && stampOf(after).signature === wanted.signature;
  return still ? { kind: 'read', bytes } : CHANGED;
}

function formRefusal(found: BigIntStats, largestBytes: number): string | null {
  // A second name may be anybody's file: a feed must not be a way to read it.
  if (found.nlink > 1n) return `has ${found.nlink} names (hard links); deliver a copy with one name`;
  if (found.size > BigInt(largestBytes)) return `is ${found.size} bytes long; the limit is ${largestBytes}`;
  return null;
}

/**
 * The path that the opened file really has: a folder on the way may have been swapped for a link since the scan. Linux tells it
 * for the open file itself; elsewhere the way is resolved again, which leaves a moment's gap.
 */
async function whereOpened(handle: FileHandle, path: Buffer): Promise<Buffer | null> {
  try {
    return await readlink(`/proc/self/fd/${handle.fd}`, { encoding: 'buffer' });
  } catch {
    try {
      return await realpath(path, { encoding: 'buffer' });
    } catch (error) {
      if (isGone(error)) return null;
      throw error;
    }
  }
}

/** One byte more than expected is asked for, to see a file that grew. */
async function readAtMost(handle: FileHandle, size: number): Promise<Buffer> {
  const bytes = Buffer.allocUnsafe(size + 1);
  let filled = 0;
  while (filled < bytes.length) {
    const { bytesRead } = await handle.read(bytes, filled, bytes.length - filled, filled);
    if (bytesRead === 0) break;
    filled += bytesRead;
  }
  return bytes.subarray(0, filled);
}
