import type { BigIntStats, Dirent } from 'node:fs';
import { lstat, opendir, realpath, stat } from 'node:fs/promises';
import { displayName, isPassedOver, joinBytes } from './fileName.ts';
import { type FileStamp, stampOf } from './signature.ts';

/**
 * Lists what stands in a feed's folder now. This is the truth of the watcher; notices only say when to look. Links are never
 * followed, and what is not a regular file is named with its kind, never opened.
 */
export interface FoundFile {
  /** Relative to the feed's folder; the one writing of its name (`displayName`). */
  readonly path: string;
  readonly pathBytes: Buffer;
  readonly stamp: FileStamp;
}

export type Scan =
  | {
      readonly kind: 'listed';
      /** The folder itself, links resolved. */
      readonly root: Buffer;
      /** Device and inode of the folder: another value means another folder under the same name. */
      readonly rootIdentity: string;
      readonly files: readonly FoundFile[];
      /** Entries that cannot be a delivered file, and folders that could not be listed: path and reason. */
      readonly refused: readonly Refused[];
    }
  | { readonly kind: 'root gone'; readonly reason: string };

export interface Refused extends Pick<FoundFile, 'path' | 'pathBytes'> {
  readonly reason: string;
}

export interface ScanOptions {
  readonly recursive: boolean;
  /** Bounds for what a stranger may put there. */
  readonly mostFiles?: number;
  readonly deepestFolder?: number;
  /** After each so many entries. */
  onProgress?(): void;
}

const ENTRIES_A_PROGRESS = 1000;

const MOST_FILES = 1_000_000;
const DEEPEST_FOLDER = 32;

export async function scanFolder(folder: string, options: ScanOptions): Promise<Scan> {
  let root: Buffer;
  let rootStat: BigIntStats;
  try {
    root = await realpath(Buffer.from(folder), { encoding: 'buffer' });
    rootStat = await stat(root, { bigint: true });
  } catch (error) {
    return { kind: 'root gone', reason: reasonFor(error) };
  }
  if (!rootStat.isDirectory()) return { kind: 'root gone', reason: 'is not a folder any more' };

  const files: FoundFile[] = [];
  const refused: Refused[] = [];
  const refuse = (pathBytes: Buffer, reason: string) =>
    refused.push({ path: displayName(pathBytes), pathBytes, reason });
  const most = options.mostFiles ?? MOST_FILES;
  let entries = 0;
  const waiting: { readonly path: Buffer; readonly depth: number }[] = [{ path: Buffer.alloc(0), depth: 0 }];
  for (let place = waiting.shift(); place !== undefined; place = waiting.shift()) {
    const { path, depth } = place;
    try {
      for await (const { name, entry } of entriesOf(joinBytes(root, path))) {
        entries += 1;
        if (entries % ENTRIES_A_PROGRESS === 0) options.onProgress?.();
        if (isPassedOver(name)) continue;
        const inner = joinBytes(path, name);
        if (entry.isDirectory()) {
          if (!options.recursive) continue;
          if (depth < (options.deepestFolder ?? DEEPEST_FOLDER)) waiting.push({ path: inner, depth: depth + 1 });
          else refuse(inner, 'folders are nested too deeply');
          continue;
        }
        const found = await look(root, inner);
        if (found === null) continue;
        if ('reason' in found) refused.push(found);
        else if (files.length < most) files.push(found);
        else {
          refuse(path, `more than ${most} files; the rest is not looked at`);
          return listed();
        }
      }
    } catch (error) {
      if (path.length === 0) return { kind: 'root gone', reason: reasonFor(error) };
      if (!isGone(error)) refuse(path, `folder ${reasonFor(error)}`);
    }
  }
  return listed();

  function listed(): Scan {
    return { kind: 'listed', root, rootIdentity: `${rootStat.dev}:${rootStat.ino}`, files, refused };
  }
}

/** Names as bytes; the types of the library know only texts here. */
async function* entriesOf(folder: Buffer): AsyncGenerator<{ readonly name: Buffer; readonly entry: Dirent }> {
  const directory = await opendir(folder as unknown as string, {
    encoding: 'buffer' as BufferEncoding,
    bufferSize: 256,
  });
  for await (const entry of directory) yield { name: entry.name as unknown as Buffer, entry };
}

/** Null when it is gone by now. */
async function look(root: Buffer, path: Buffer): Promise<FoundFile | Refused | null> {
  const name = displayName(path);
  try {
    const found = await lstat(joinBytes(root, path), { bigint: true });
    const reason = refusalOf(found);
    return reason === null
      ? { path: name, pathBytes: path, stamp: stampOf(found) }
      : { path: name, pathBytes: path, reason };
  } catch (error) {
    return isGone(error) ? null : { path: name, pathBytes: path, reason: reasonFor(error) };
  }
}

/** Why something in a feed's folder is not a file to read; null for a regular file. */
export function refusalOf(found: BigIntStats): string | null {
  if (found.isFile()) return null;
  if (found.isSymbolicLink()) return 'is a symbolic link; links are not followed';
  if (found.isDirectory()) return 'is a folder';
  if (found.isFIFO()) return 'is a named pipe, not a file';
  if (found.isSocket()) return 'is a socket, not a file';
  return 'is a device, not a file';
}

export function isGone(error: unknown): boolean {
  const { code } = error as NodeJS.ErrnoException;
  return code === 'ENOENT' || code === 'ENOTDIR';
}

export function reasonFor(error: unknown): string {
  const { code, message } = error as NodeJS.ErrnoException;
  if (code === 'ENOENT' || code === 'ENOTDIR') return 'does not exist';
  if (code === 'EACCES' || code === 'EPERM') return 'cannot be read by this user (permission denied)';
  if (code === 'ELOOP') return 'is a symbolic link; links are not followed';
  return `cannot be read (${code ?? message})`;
}
