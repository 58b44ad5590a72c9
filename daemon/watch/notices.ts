import { type FSWatcher, watch } from 'chokidar';
import { reasonFor } from './scan.ts';

/**
 * Tells that something moved in a feed's folder, and nothing more: the system's queue of notices overflows without a word, and a
 * folder made anew goes unheard. So a notice only wakes the scan, and without notices the scan goes on by itself.
 */
export interface Notices {
  close(): Promise<void>;
}

export interface NoticeOptions {
  readonly folder: string;
  readonly recursive: boolean;
  onNotice(): void;
  /** Once: from now on there are only scans. */
  onFailure(reason: string): void;
}

/** Swapped in tests alone. */
export type Watch = typeof watch;

export function watchForNotices(options: NoticeOptions, arm: Watch = watch): Notices {
  let failed = false;
  let watcher: FSWatcher | null = null;
  const fail = (error: unknown) => {
    if (failed) return;
    failed = true;
    options.onFailure(inWords(error));
    watcher?.close().catch(() => {});
  };
  try {
    watcher = arm(options.folder, {
      ignoreInitial: true,
      followSymlinks: false,
      ignorePermissionErrors: true,
      ...(options.recursive ? {} : { depth: 0 }),
      // Folders alone are watched: their notices name the files in them, and a watch a file would use up the system's stock.
      ignored: (_path, stats) => stats !== undefined && !stats.isDirectory(),
    });
    // What came between the last look and now was not heard.
    watcher.on('ready', () => options.onNotice());
    watcher.on('raw', () => options.onNotice());
    watcher.on('all', () => options.onNotice());
    watcher.on('error', fail);
  } catch (error) {
    fail(error);
  }
  return {
    close: async () => {
      failed = true;
      await watcher?.close();
    },
  };
}

function inWords(error: unknown): string {
  // The system says "no space left on device" when it means its stock of watches.
  const { code } = error as NodeJS.ErrnoException;
  if (code === 'ENOSPC') return 'the limit of file watches is used up (raise fs.inotify.max_user_watches)';
  if (code === 'EMFILE') return 'the limit of open files or watch instances is used up';
  return reasonFor(error);
}
