/**
 * A run of arrivals that fit nothing: a large step is on trial. Its size is sought by the circular search, from before the run,
 * again and again as arrivals come in, until one size has won: few arrivals fit many sizes. Before a pulsar is
 * locked the same search corrects a start model that is too far off.
 */

import { joinFamily, NULL_BEAM, type Snapshot } from './bank.ts';
import { pruned } from './beam.ts';
import { BENDS, HIGHEST_STEP, LOWEST_STEP, STRAIGHT, searchStep } from './circularSearch.ts';
import type { Hypothesis } from './hypothesis.ts';
import { bestFollowed } from './largeStepSizes.ts';
import { expectedDeviation, expectedSpread } from './outlook.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { expectRecovery } from './recoveryStates.ts';
import { shareOfCount } from './sameCount.ts';
import type { Track } from './track.ts';

/** A large step on trial. */
export interface LargeStep {
  /** Index of the first arrival after it. */
  readonly start: number;
  readonly before: Snapshot;
  /** Arrivals since it at which its size is sought next. */
  nextSearch: number;
  /** Number of the event it has become. */
  track: number | null;
}

const LEAST_RUN = 4;
const LEAST_RUN_DAYS = 0.5;
/** Searched again when the run has grown by this factor. */
const RUN_GROWTH = 1.4;
/** Later arrivals tell recoveries apart, not sizes: the search looks at the first ones, the hypotheses at all. */
const MOST_POINTS = 14;
/** Sizes kept open; arrivals after which no more is sought. */
const MOST_SIZES = 48;
const LONGEST_TRIAL = 60;
/** One size has won: arrivals since the step, the latest that fit it, and its share of the weight. */
const WON_RUN = 10;
const WON_FITS = 5;
const WON_SHARE = 0.999;

/**
 * Natural log of how much likelier an arrival is set aside, or taken for good, within a run that fits nothing than outside one:
 * outliers are 2 in 100, and 15 in 100 arrivals anywhere within a turn are taken for good by chance.
 */
const LOG_ODDS_SET_ASIDE = Math.log(0.85 / 0.02);
const LOG_ODDS_USED = Math.log(0.15 / 0.98);
const LONGEST_RUN = 40;
/** The latest arrivals were taken for good so often that a run before them is over: five of them by chance, 0.15⁵. */
const LOG_ODDS_OVER = 4.5 * LOG_ODDS_USED;

/**
 * Where the run of arrivals that the hypothesis cannot explain most probably began, not before `from`; after the last arrival
 * if there is none.
 */
export function runStart(h: Hypothesis, index: number, from: number): number {
  let start = index + 1;
  let odds = 0;
  let highest = 0;
  for (let s = h.story; s !== null && s.index >= from && index - s.index < LONGEST_RUN; s = s.before) {
    odds += s.used ? LOG_ODDS_USED : LOG_ODDS_SET_ASIDE;
    if (highest === 0 && odds < LOG_ODDS_OVER) break;
    if (odds <= highest) continue;
    highest = odds;
    start = s.index;
  }
  return start;
}

/** Adds what it finds to the bank; does nothing while the latest arrivals fit. */
export function searchLargeStep(watch: PulsarWatch, index: number): void {
  watch.largeStep ??= newTrial(watch, index);
  const step = watch.largeStep;
  if (step === null) return;
  if (isOver(watch, step, index)) {
    endTrial(watch);
    return;
  }
  const run = index + 1 - step.start;
  if (run < step.nextSearch) return;
  step.nextSearch = Math.ceil(run * RUN_GROWTH);
  if (watch.locked) expectRecovery(watch);
  const { seen } = watch.line;
  const { hypothesis, tDays } = step.before;
  const turnsPerDay = watch.model.spin.frequencyHz.hi * 86_400;
  const points = seen.slice(step.start, Math.min(index + 1, step.start + MOST_POINTS)).map((s, i) => ({
    days: s.tDays - seen[step.start]!.tDays,
    deviation: wrapped(s.deviation - expectedDeviation(watch, hypothesis, tDays, step.start + i)),
  }));
  const spread = expectedSpread(watch, hypothesis, tDays, index);
  const bends = watch.locked ? BENDS : STRAIGHT;
  const peaks = searchStep(points, LOWEST_STEP * turnsPerDay, HIGHEST_STEP * turnsPerDay, spread, bends);
  const found = bestFollowed(watch, peaks, step, index);
  if (found.length === 0) return;
  for (const h of found) h.logWeight -= watch.bank!.logScale;
  handOver(watch, step, pruned(found, MOST_SIZES));
}

export function endTrial(watch: PulsarWatch): void {
  watch.largeStep = null;
  if (watch.bank !== null) watch.bank.width = NULL_BEAM;
}

function newTrial(watch: PulsarWatch, index: number): LargeStep | null {
  const bank = watch.bank!;
  const { seen } = watch.line;
  const start = runStart(bank.beam[0]!, index, watch.lockedFrom);
  if (index + 1 - start < LEAST_RUN || seen[index]!.tDays - seen[start]!.tDays < LEAST_RUN_DAYS) return null;
  const before = bank.snapshots.find((s) => s.index === start - 1);
  return before === undefined ? null : { start, before, nextSearch: 0, track: null };
}

/** One size has won and the arrivals fit again; or nothing came of it. */
function isOver(watch: PulsarWatch, step: LargeStep, index: number): boolean {
  const run = index + 1 - step.start;
  if (run > LONGEST_TRIAL) return true;
  const best = watch.bank!.beam[0]!;
  if (step.track === null)
    return runStart(best, index, watch.lockedFrom) > index && !watch.tracks.some((t) => isOpenAt(t, step.start));
  if (watch.tracks[step.track]!.state === 'withdrawn') return true;
  if (run < WON_RUN) return false;
  let fits = 0;
  for (let s = best.story; s?.used; s = s.before) fits++;
  return fits >= WON_FITS && shareOfCount(watch, best) > WON_SHARE;
}

function isOpenAt(track: Track, gap: number): boolean {
  return track.state === 'suspected' && track.firstGap <= gap && gap <= track.lastGap;
}

function handOver(watch: PulsarWatch, step: LargeStep, found: Hypothesis[]): void {
  const bank = watch.bank!;
  bank.width = MOST_SIZES;
  if (watch.locked && step.track === null) {
    joinFamily(bank, 'glitch', step.start, found, MOST_SIZES);
    return;
  }
  // Before the lock it is the start model that is wrong; after its confirmation the null holds the step already.
  const { track } = step;
  const tagged = track === null ? found : found.map((h) => ({ ...h, tracks: [...h.tracks, track] }));
  bank.beam = pruned([...bank.beam, ...tagged], MOST_SIZES);
}

function wrapped(turns: number): number {
  return turns - Math.round(turns);
}
