import { createHash } from 'node:crypto';
import type { Station } from '../station.ts';

/**
 * Files are read as their feed's configuration says. What it said leaves a mark in the signature of each file on record, none for
 * `csv`: when the feed is described anew, the signature no longer fits, every file of the feed is read again by itself, and rows
 * that now say something else are revised.
 */
export function layoutMark({ configuration }: Pick<Station, 'configuration'>, feed: string): string {
  const described = configuration.feeds.find(({ name }) => name === feed);
  if (described === undefined || described.layout === 'csv') return '';
  const text = JSON.stringify([described.layout, described.columns], (_, value) =>
    value instanceof Map ? [...value] : value,
  );
  return ` layout:${createHash('sha256').update(text).digest('hex').slice(0, 16)}`;
}

export function withoutLayoutMark(signature: string): { readonly plain: string; readonly mark: string } {
  const mark = / layout:[0-9a-f]{16}$/.exec(signature)?.[0] ?? '';
  return { plain: signature.slice(0, signature.length - mark.length), mark };
}
