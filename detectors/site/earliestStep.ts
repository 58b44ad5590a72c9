/** The earliest step that any clock shows. */

import { type ClockScan, type Found, SAME_STEP_DAYS } from './clockScan.ts';
import { byName } from './clocks.ts';

/** All clocks are gone through side by side, so many days at a time: what lies beyond the earliest step is not looked at. */
const SLAB_DAYS = 64;

/** All scans taken on side by side, until one finds a step and no other can find an earlier one. */
export function earliestOf(scans: readonly ClockScan[]): Found | null {
  const found = new Map<ClockScan, Found>();
  let untilMjd = -Infinity;
  while (scans.some((scan) => !scan.ended && !found.has(scan)) || found.size > 0) {
    for (const scan of scans) {
      const next = found.has(scan) ? null : scan.next(untilMjd);
      if (next !== null) found.set(scan, next);
    }
    if (found.size === 0) {
      untilMjd = Math.min(...scans.filter(({ ended }) => !ended).map(({ seenUntilMjd }) => seenUntilMjd)) + SLAB_DAYS;
      continue;
    }
    const neededMjd = Math.min(...[...found.values()].map(({ step }) => step.beforeMjd)) + SAME_STEP_DAYS;
    if (neededMjd <= untilMjd) return choice([...found.values()]);
    untilMjd = neededMjd;
  }
  return null;
}

function choice(found: readonly Found[]): Found {
  const inOrder = [...found].sort((a, b) => a.step.beforeMjd - b.step.beforeMjd || byName(a.step, b.step));
  const first = inOrder[0]!;
  return inOrder
    .filter(({ step }) => step.site === first.step.site && step.beforeMjd < first.step.beforeMjd + SAME_STEP_DAYS)
    .reduce((a, b) => (b.step.logOdds > a.step.logOdds ? b : a));
}
