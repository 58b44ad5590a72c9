import { lstat, realpath } from 'node:fs/promises';
import { basename, dirname } from 'node:path';
import { compareMjd, type Mjd } from '../detectors/time/mjd.ts';
import { OperatorError, reasonOf } from './errors.ts';
import { feedFolders, placeIn } from './feedFolders.ts';
import { Pipeline, type TakenIn } from './pipeline.ts';
import { type FileInHand, readInHand } from './stages/intake.ts';
import type { Station } from './station.ts';
import { displayName } from './watch/fileName.ts';
import { readStill } from './watch/open.ts';
import { stampOf } from './watch/signature.ts';

/** Takes an archive in, offline: the same pipeline as `watch`, the oldest arrivals first. */
export interface ReplayOptions {
  readonly files: readonly string[];
  /** For files that lie in no feed's folder. */
  readonly feed: string | null;
  /** Decide and mail after each file, as the watch would have; else decide once, at the end, and tell nobody. */
  readonly mail: boolean;
  readonly onProgress: (done: number, total: number, what: 'files' | 'pulsars') => void;
}

export interface Replayed {
  readonly files: number;
  readonly known: number;
  readonly rows: number;
  readonly newArrivals: number;
  readonly quarantined: number;
  /** Files that could not be read from disk. */
  readonly unreadable: readonly Unreadable[];
}

interface Unreadable {
  readonly file: string;
  readonly reason: string;
}

export async function replay(station: Station, options: ReplayOptions): Promise<Replayed> {
  const { files, unreadable } = await inOrder(station, options);
  const pipeline = new Pipeline(station);
  const results: TakenIn[] = [];
  for (const file of files) {
    const inHand = await readNow(file);
    if ('reason' in inHand) unreadable.push(inHand);
    else {
      const decide = options.mail ? 'now' : 'later';
      const result = await pipeline.takeIn(inHand, { decide, mail: options.mail, acceptUnterminated: true });
      results.push(result);
    }
    options.onProgress(results.length + unreadable.length, files.length, 'files');
  }
  // In one go: events that an archive would show only in passing are never written.
  const open = pipeline.undecided();
  const onPulsar = (done: number) => options.onProgress(done, open.length, 'pulsars');
  if (open.length > 0) await pipeline.decide(open, { mail: options.mail, onPulsar });
  return { ...totals(results), unreadable };
}

function totals(results: readonly TakenIn[]): Omit<Replayed, 'unreadable'> {
  const sum = (of: (result: TakenIn) => number) => results.reduce((total, result) => total + of(result), 0);
  return {
    files: results.length,
    known: results.filter((result) => result.kind === 'known').length,
    rows: sum((result) => result.rows),
    newArrivals: sum((result) => result.newArrivals),
    quarantined: sum((result) => result.quarantined),
  };
}

interface ArchiveFile {
  readonly feed: string;
  /** With links resolved. */
  readonly file: string;
  readonly pathInFeed: string;
  readonly earliest: Mjd | null;
}

/** Every file once, by its earliest arrival. They are read twice, so that an archive need not fit into memory. */
async function inOrder(
  station: Station,
  options: ReplayOptions,
): Promise<{ files: ArchiveFile[]; unreadable: Unreadable[] }> {
  const { configuration } = station;
  const folders = await feedFolders(configuration, options.feed);
  const files = new Map<string, ArchiveFile>();
  const unreadable: Unreadable[] = [];
  for (const given of options.files) {
    try {
      const file = await realpath(given);
      const inHand = { ...placeIn(folders, file, options.feed), file, earliest: null };
      const read = await readNow(inHand);
      if ('reason' in read) unreadable.push(read);
      else files.set(file, { ...inHand, earliest: earliestOf(station, read) });
    } catch (error) {
      if (error instanceof OperatorError) throw error;
      unreadable.push({ file: given, reason: reasonOf(error) });
    }
  }
  return { files: [...files.values()].sort(byEarliest), unreadable };
}

function earliestOf(station: Station, inHand: FileInHand): Mjd | null {
  const times = readInHand(station, inHand).rows.map((row) => row.time);
  return times.reduce<Mjd | null>(
    (first, time) => (first === null || compareMjd(time, first) < 0 ? time : first),
    null,
  );
}

function byEarliest(a: ArchiveFile, b: ArchiveFile): number {
  if (a.earliest === null || b.earliest === null) return Number(a.earliest === null) - Number(b.earliest === null);
  return compareMjd(a.earliest, b.earliest) || (a.file < b.file ? -1 : 1);
}

async function readNow(file: ArchiveFile): Promise<FileInHand | Unreadable> {
  const { signature } = stampOf(await lstat(file.file, { bigint: true }));
  const root = Buffer.from(dirname(file.file));
  const reading = await readStill({ root, pathBytes: Buffer.from(basename(file.file)), signature });
  if (reading.kind !== 'read') return { file: file.file, reason: reading.reason };
  const pathBytes = Buffer.from(file.pathInFeed);
  return { feed: file.feed, path: displayName(pathBytes), pathBytes, bytes: reading.bytes, signature };
}
