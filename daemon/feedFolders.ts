import { realpath } from 'node:fs/promises';
import { relative, sep } from 'node:path';
import type { Configuration, Feed } from './config/configuration.ts';
import { EXIT, OperatorError } from './errors.ts';

/** Which feed a file belongs to that somebody names on the command line. */
export interface FeedFolder {
  readonly feed: Feed;
  /** With links resolved. */
  readonly folder: string;
}

/** @param wanted a feed that somebody named; an `OperatorError` says which there are */
export async function feedFolders(
  { feeds, file }: Configuration,
  wanted: string | null,
): Promise<readonly FeedFolder[]> {
  if (wanted !== null && !feeds.some(({ name }) => name === wanted)) {
    throw new OperatorError(`there is no feed “${wanted}” in ${file}`, {
      exitCode: EXIT.wrongUsage,
      advice: `feeds: ${feeds.map(({ name }) => name).join(', ')}`,
    });
  }
  return Promise.all(
    feeds.map(async (feed) => ({ feed, folder: await realpath(feed.folder).catch(() => feed.folder) })),
  );
}

/** The feed that was named, else the one whose folder holds the file (a path with links resolved). */
export function placeIn(
  folders: readonly FeedFolder[],
  file: string,
  wanted: string | null,
): { readonly feed: string; readonly pathInFeed: string } {
  const holder =
    folders.find(({ feed }) => feed.name === wanted) ?? folders.find(({ folder }) => file.startsWith(folder + sep));
  if (holder === undefined) {
    throw new OperatorError(`${file} lies in no feed's folder`, {
      exitCode: EXIT.wrongUsage,
      advice: `say how to read it with --feed NAME (feeds: ${folders.map(({ feed }) => feed.name).join(', ')})`,
    });
  }
  return { feed: holder.feed.name, pathInFeed: relative(holder.folder, file) };
}
