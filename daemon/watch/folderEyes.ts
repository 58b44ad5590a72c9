import type { Feed } from '../config/configuration.ts';
import { type Reading, readStill, type Wanted } from './open.ts';
import { type Scan, scanFolder } from './scan.ts';

/** How the watcher sees a feed's folder: all its questions to the file system but the notices. One question at a time. */
export interface FolderEyes {
  /** Rejects with `NoAnswer` when the file system is silent. */
  scan(): Promise<Scan>;
  read(wanted: Wanted): Promise<Reading>;
  /** A question that is open ends without an answer. */
  close(): void;
}

export type OpenEyes = (feed: Pick<Feed, 'folder' | 'recursive'>, largestBytes: number) => FolderEyes;

/** The folder is on a file system that hangs. */
export class NoAnswer extends Error {}

/** In this process, where a file system that hangs would hold one of its few file threads for ever. */
export const ownEyes: OpenEyes = ({ folder, recursive }, largestBytes) => ({
  scan: () => scanFolder(folder, { recursive }),
  read: (wanted) => readStill(wanted, { largestBytes }),
  close: () => {},
});
