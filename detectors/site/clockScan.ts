/**
 * One clock gone through gap by gap, from some moment on, until its pulsars show a step: the strongest within days of where they
 * first hint at one, so that a step which is only the shadow of a larger one beside it is not taken for one of its own.
 */

import { type BelievedStep, believed, HINT_LOG_ODDS } from './belief.ts';
import { type Candidate, candidates, type Gap, type GapSource, GRID_DAYS } from './candidates.ts';
import type { ClockName } from './clocks.ts';

/** Gaps this near to each other may hold one and the same step, days. */
export const SAME_STEP_DAYS = 10;
/** The gap that is sought lies no further than this from the best on the grid, days. */
const BESIDE_DAYS = 2 * GRID_DAYS;

/** A stretch of gaps that had to be looked at together, MJD. */
export interface Stretch {
  readonly fromMjd: number;
  readonly toMjd: number;
}

export interface Found {
  readonly step: BelievedStep;
  /** Where its stretch begins, MJD. */
  readonly hintMjd: number;
}

export class ClockScan {
  readonly #clock: ClockName;
  readonly #gaps: Generator<Gap>;
  readonly #stretches: Stretch[] = [];
  #seenUntilMjd: number;
  #ended: boolean;

  constructor(clock: ClockName, source: GapSource) {
    this.#clock = clock;
    this.#gaps = candidates(source);
    this.#seenUntilMjd = source.sessionsMjd[0] ?? Infinity;
    this.#ended = source.sessionsMjd.length < 2;
  }

  get stretches(): readonly Stretch[] {
    return this.#stretches;
  }

  /** The last session that was looked at, MJD. */
  get seenUntilMjd(): number {
    return this.#seenUntilMjd;
  }

  get ended(): boolean {
    return this.#ended;
  }

  /** The next step in a stretch that begins before `untilMjd`; null: none. */
  next(untilMjd: number): Found | null {
    while (!this.#ended && this.#seenUntilMjd < untilMjd) {
      const hint = this.#advance([]);
      if (hint === null) continue;
      const { best, hints } = this.#stretchFrom(hint);
      this.#stretches.push({ fromMjd: hint.afterMjd, toMjd: this.#seenUntilMjd });
      const step = believed(this.#clock, best, hints);
      if (step !== null) return { step, hintMjd: hint.afterMjd };
    }
    return null;
  }

  /** All gaps that hint at a step until none does better for days; around the best every gap is weighed. */
  #stretchFrom(hint: Candidate): { readonly best: Candidate; readonly hints: readonly Candidate[] } {
    const hints = [hint];
    const leftOut: Gap[] = [];
    let best = hint;
    while (!this.#ended && this.#seenUntilMjd < best.beforeMjd + SAME_STEP_DAYS) {
      const more = this.#advance(leftOut);
      if (more === null) continue;
      hints.push(more);
      best = better(best, more);
    }
    const isBeside = (gap: Gap) => Math.abs(gap.beforeMjd - best.beforeMjd) < BESIDE_DAYS;
    const beside = leftOut.filter(isBeside).map((gap) => gap.weigh!());
    hints.push(...beside.filter(({ logOdds }) => logOdds > HINT_LOG_ODDS));
    return { best: hints.reduce(better), hints };
  }

  /** Past the next gap; the candidate in it, if it hints at a step. Gaps that are not on the grid are left out. */
  #advance(leftOut: Gap[]): Candidate | null {
    const { value: gap } = this.#gaps.next() as IteratorResult<Gap, undefined>;
    if (gap === undefined) {
      this.#ended = true;
      return null;
    }
    this.#seenUntilMjd = gap.beforeMjd;
    if (gap.weigh === null) return null;
    if (!gap.isOnGrid) {
      leftOut.push(gap);
      return null;
    }
    const candidate = gap.weigh();
    return candidate.logOdds > HINT_LOG_ODDS ? candidate : null;
  }
}

function better(a: Candidate, b: Candidate): Candidate {
  return b.logWeight > a.logWeight ? b : a;
}
