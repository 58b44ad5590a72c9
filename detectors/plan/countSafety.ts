/** Until when the next arrival should come, so that its pulse can still be numbered without doubt. */

import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { lastMjd, nullAhead } from './ahead.ts';

export interface CountSafety {
  /** From then on the predicted phase is less sure than `COUNT_SPREAD_TURNS`; null: not within ten years. */
  readonly safeUntilMjd: number | null;
  /** Days from the last arrival to then. */
  readonly safeDays: number | null;
}

/** σ of the predicted phase up to which the count is safe (five σ to half a turn). */
export const COUNT_SPREAD_TURNS = 0.1;
const LONGEST_DAYS = 3652.5;

export function countSafety(watch: PulsarWatch): CountSafety {
  const spread = (days: number) => Math.sqrt(nullAhead(watch, days).cov[0]!);
  if (spread(LONGEST_DAYS) < COUNT_SPREAD_TURNS) return { safeUntilMjd: null, safeDays: null };
  let low = 0;
  let high = LONGEST_DAYS;
  while (high - low > 0.01) {
    const middle = (low + high) / 2;
    if (spread(middle) < COUNT_SPREAD_TURNS) low = middle;
    else high = middle;
  }
  return { safeUntilMjd: lastMjd(watch) + low, safeDays: low };
}
