import type { BigIntStats } from 'node:fs';

/** What tells one content of a file from the next without reading it. */
export interface FileStamp {
  readonly bytes: number;
  readonly modifiedMs: number;
  /** Size, modification and change time to the nanosecond, device and inode: equal only while nothing has touched the file. */
  readonly signature: string;
}

export function stampOf(stat: BigIntStats): FileStamp {
  return {
    bytes: Number(stat.size),
    modifiedMs: Number(stat.mtimeNs / 1000n) / 1000,
    signature: [stat.size, stat.mtimeNs, stat.ctimeNs, stat.dev, stat.ino].join(':'),
  };
}
