import { realpathSync, type Stats, statSync } from 'node:fs';
import { basename, dirname, join, relative, sep } from 'node:path';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/**
 * The folders that the configuration names: what is there already, and that none that the daemon writes to lies in one that it
 * only reads. Feeds are open to others; nothing that we trust may stand in them.
 */
export interface NamedFolder {
  /** As in `feed "archive"` or `the state folder`. */
  readonly title: string;
  readonly path: TomlPath;
  readonly folder: string;
}

/** A feed that is away may be a disk not mounted yet: the daemon starts and waits for it. */
export function checkFeedFolder(reader: SectionReader, { path, folder }: NamedFolder): void {
  const stat = statOf(folder);
  if (stat === null)
    reader.warning(path, `${folder} does not exist or cannot be reached; the feed is silent until it can`);
  else if (!stat.isDirectory()) reader.error(path, `${folder} is not a folder`);
}

/** The state folder is made at the first start; one that is there must be ours alone. */
export function checkStateFolder(reader: SectionReader, { path, folder }: NamedFolder): void {
  const stat = statOf(folder);
  if (stat === null) return;
  if (!stat.isDirectory()) {
    reader.error(path, `${folder} is not a folder`);
    return;
  }
  if ((stat.mode & 0o002) !== 0) {
    reader.error(path, `anybody can write to ${folder}; run: chmod o-w '${folder}'`);
  }
  const self = process.geteuid?.();
  if (self !== undefined && self !== 0 && stat.uid !== self) {
    reader.error(path, `${folder} belongs to another user; run: chown ${self} '${folder}'`);
  }
}

/** Complains once for each pair where one of them is a feed and one holds the other. */
export function checkOverlaps(
  reader: SectionReader,
  feeds: readonly NamedFolder[],
  others: readonly NamedFolder[],
): void {
  const settled = new Map([...feeds, ...others].map((named) => [named, realFolder(named.folder)]));
  for (const [index, feed] of feeds.entries()) {
    for (const other of [...feeds.slice(0, index), ...others]) {
      const a = settled.get(feed)!;
      const b = settled.get(other)!;
      if (a === b) reader.error(feed.path, `is the same as ${other.title}`);
      else if (holds(a, b)) reader.error(feed.path, `holds ${other.title} (${other.folder}); keep them apart`);
      else if (holds(b, a)) reader.error(feed.path, `lies in ${other.title} (${other.folder}); keep them apart`);
    }
  }
}

function holds(outer: string, inner: string): boolean {
  const way = relative(outer, inner);
  return way !== '' && way !== '..' && !way.startsWith(`..${sep}`);
}

/** With links resolved as far as the path exists: the rest is made later. */
function realFolder(folder: string): string {
  try {
    return realpathSync(folder);
  } catch {
    const above = dirname(folder);
    return above === folder ? folder : join(realFolder(above), basename(folder));
  }
}

function statOf(folder: string): Stats | null {
  try {
    return statSync(folder);
  } catch {
    return null;
  }
}
