import type { Station } from '../station.ts';
import { emptyBatch } from '../store/index.ts';
import type { WatchProblem } from '../watch/feedLook.ts';

/** Kinds of trouble that leave what stands in a feed's folder unread. */
const LEAVES_UNREAD: ReadonlySet<WatchProblem['kind']> = new Set(['refused', 'unreadable']);
/** No file has this signature: the path is read as soon as it can be. */
const NEVER_READ = '';

/**
 * What the watcher cannot read goes on record like any other file that could not be used, once for each reason: so it is seen in the
 * morning. What the path said before stands.
 */
export function quarantineUnread(station: Station, { feed, kind, path, pathBytes, message }: WatchProblem): void {
  if (path === null || pathBytes === undefined || !LEAVES_UNREAD.has(kind)) return;
  const pathBytesHex = pathBytes.toString('hex');
  const known = station.store.knownFile(feed, { bytesHex: pathBytesHex });
  if (known?.fault === message && known.signature === NEVER_READ) return;
  station.store.commitIntake({
    ...emptyBatch(station.clock.now().toISOString()),
    file: {
      feed,
      path: path === '' ? '.' : path,
      pathBytesHex,
      sha256: '',
      // As it was read last, to know a shorter one when it can be read again.
      bytes: known?.bytes ?? 0,
      signature: NEVER_READ,
      rows: 0,
      fault: message,
    },
    quarantined: [{ line: null, reason: message }],
  });
}
