import type { Feed } from '../config/configuration.ts';
import type { Look, WatchProblem } from './feedLook.ts';
import { type Notices, type Watch, watchForNotices } from './notices.ts';

/**
 * Holds the notices of one feed; sets them up anew when another folder stands under the feed's name. Where the operator says how often to look (network
 * file systems, which send none) there are none: asking for them could hang.
 */
export interface NoticeKeeper {
  /** After each look. What is wrong with the notices, if anything. */
  follow(root: Look['root']): readonly WatchProblem[];
  close(): Promise<void>;
}

export function createNoticeKeeper(feed: Feed, onNotice: () => void, arm?: Watch): NoticeKeeper {
  let notices: Notices | null = null;
  let armedFor: string | null = null;
  let failure: WatchProblem | null = null;
  const { recursive, polling, pollSeconds } = feed;
  const onFailure = (reason: string) => {
    const message = `no notices of new files: ${reason}; the folder is looked at every ${pollSeconds} s all the same`;
    failure = { feed: feed.name, kind: 'no notices', path: null, message };
    onNotice();
  };
  return {
    follow(root) {
      if (root !== null && !polling && root.identity !== armedFor) {
        notices?.close().catch(() => {});
        armedFor = root.identity;
        failure = null;
        const folder = root.folder.toString('utf8');
        notices = watchForNotices({ folder, recursive, onNotice, onFailure }, arm);
      }
      return failure === null ? [] : [failure];
    },
    async close() {
      await notices?.close();
    },
  };
}
