/** An event on the way to a decision: suspected, confirmed or withdrawn, with its weight of evidence. */

import type { Kind } from './births.ts';

export interface Track {
  /** Tags the hypotheses that hold the event for true. */
  readonly number: number;
  readonly id: string;
  kind: Kind;
  state: 'suspected' | 'confirmed' | 'withdrawn';
  /** Arrival (index) after the most probable gap, and the range of gaps that holds 95 % of the weight. */
  bestGap: number;
  firstGap: number;
  lastGap: number;
  readonly suspectedAt: number;
  confirmedAt: number | null;
  /** |Δν| in turns/day as the decision saw it: the scale of the recovery to be expected. */
  rateStep: number;
  /** Arrival (index) from which event and noise are weighed against each other again. */
  askAgainAt: number;
  /** Natural-log posterior odds: this event against none. */
  logOdds: number;
  /** Probability by explanation, wandering and lost count among them. */
  explanations: Readonly<Record<string, number>>;
  /** No hypothesis without the event is left: its odds no longer change. */
  settled: boolean;
}

/** Where the weight of one kind lies among the gaps. */
export interface GapSpread {
  readonly bestGap: number;
  readonly firstGap: number;
  readonly lastGap: number;
}

export function overlaps(track: Track, spread: GapSpread): boolean {
  return track.firstGap <= spread.lastGap && spread.firstGap <= track.lastGap;
}
