import type { FoundFile } from './scan.ts';

/**
 * Whose turn it is to be read through again. A rewrite may keep a file's length and its times (a clock that was set back, a file system without
 * change times): then only its bytes tell. All files of a feed come up about once a day, a few at each look, those found first first.
 */
export interface Audit {
  /** @param files all that the look found */
  due(files: readonly FoundFile[], nowMs: number): readonly FoundFile[];
}

const DAY_MS = 86_400_000;
/** So that a look after a long pause does not hold up the next. */
const MOST_AT_ONCE = 100;

export function createAudit(startMs: number): Audit {
  let round: readonly FoundFile[] = [];
  let next = 0;
  let lastMs = startMs;
  /** Files that have come due, with a fraction. */
  let owed = 0;
  return {
    due(files, nowMs) {
      owed = Math.min(MOST_AT_ONCE, owed + (files.length * (nowMs - lastMs)) / DAY_MS);
      lastMs = nowMs;
      const count = Math.floor(owed);
      if (count === 0) return [];
      owed -= count;
      if (next >= round.length) {
        round = files;
        next = 0;
      }
      const due = round.slice(next, next + count);
      next += count;
      return due;
    },
  };
}
