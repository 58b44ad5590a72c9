/** An event on the way to a decision: suspected, confirmed or withdrawn, with its weight of evidence. */

import type { Cause } from './births.ts';
import type { Modes } from './switchingRecord.ts';

export interface Track {
  /** Tags the hypotheses that hold the event for true. */
  readonly number: number;
  readonly id: string;
  kind: Cause;
  state: 'suspected' | 'confirmed' | 'withdrawn';
  /** Arrival (index) after the most probable gap, and the range of gaps that holds 95 % of the weight. */
  bestGap: number;
  firstGap: number;
  lastGap: number;
  /** Natural log of the weight of all gaps over that of the most probable one: how many it may lie in. */
  logPlaces: number;
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
  /** What the event looks like as a whole, weighed after the fact; null before it is confirmed. */
  shapes: Shapes | null;
  /** Of the first of a series of switches between two spin-down rates. */
  modes: Modes | null;
  /** Number of the track of whose event this is a part: it is not an event of its own. */
  partOf: number | null;
  /** No hypothesis without the event is left: its odds no longer change. */
  settled: boolean;
}

/** Probability by shape (they sum to 1), and the gaps in which a slow rise may have begun. */
export interface Shapes {
  readonly shares: Readonly<Record<string, number>>;
  readonly firstGap: number;
  readonly lastGap: number;
  /** The most probable rise; null where ν does not rise. */
  readonly rise: Rise | null;
}

/** ν rises evenly from one gap to another: |Δν̇| for that time. */
export interface Rise {
  readonly firstGap: number;
  /** Null while it goes on. */
  readonly lastGap: number | null;
  readonly days: number;
  /** turns/day² */
  readonly stepTurns: number;
}

/** The rise of an event that is more probably slow than sudden. */
export function slowRise({ shapes }: Track): Rise | null {
  return shapes !== null && (shapes.shares['slow spin-up'] ?? 0) > 0.5 ? shapes.rise : null;
}

/** The gaps in which an event sets the rotation free. */
export function gapsOfEvent(track: Track): readonly number[] {
  const rise = slowRise(track);
  if (rise === null) return [track.bestGap];
  return rise.lastGap === null ? [rise.firstGap] : [rise.firstGap, rise.lastGap];
}

/** Where the weight of one kind lies among the gaps. */
export interface GapSpread {
  readonly bestGap: number;
  readonly firstGap: number;
  readonly lastGap: number;
  readonly logPlaces: number;
}

/** Natural-log odds of a suspicion that adds nothing to noise of its right strength. */
const REFUTED_LOG_ODDS = -6;

/** The noise that was learned is too quiet, and makes events of it: to be learned anew, with this in it. */
export function isRefuted({ state, confirmedAt, logOdds }: Track): boolean {
  return state === 'withdrawn' && confirmedAt === null && logOdds < REFUTED_LOG_ODDS;
}

export function overlaps(track: Track, spread: GapSpread): boolean {
  return track.firstGap <= spread.lastGap && spread.firstGap <= track.lastGap;
}
