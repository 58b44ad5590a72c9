/**
 * Finding the count again: from the arrivals after a loss, rotation rates are sought as at the start of a pulsar, by a beam
 * that knows no phase and by the circular search, until one count has won.
 */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { newBank, type Snapshot } from './bank.ts';
import { logWeightOf, observe, pruned } from './beam.ts';
import { freeSecond } from './births.ts';
import {
  BEND_STEP_TURNS,
  BENDS,
  HIGHEST_STEP,
  LOG_SIZE_RANGE,
  LOWEST_STEP,
  logBendPrior,
  searchStep,
} from './circularSearch.ts';
import { absorb, copyOf, gapOf, type Hypothesis, propagate } from './hypothesis.ts';
import { expectedDeviation, grownTo, seenAs } from './outlook.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { shareOfCount } from './sameCount.ts';
import { observationOf } from './timeline.ts';

/** The first arrival after the loss, and what was known before it. */
export interface Loss {
  /** Index of the arrival after the gap in which the count was lost; moved on when the arrivals do not lock. */
  readonly from: number;
  readonly before: Snapshot;
  /** Arrivals since `from` at which the search is made next. */
  readonly nextSearch: number;
}

const FIRST_SEARCH = 4;
const SEARCH_GROWTH = 1.3;
/** After so many arrivals without a lock the search begins anew with the latest ones. */
const PATIENCE_ARRIVALS = 40;
const FRESH_ARRIVALS = 16;
/** What locks a count again: arrivals, sessions, share of them used, spread of the prediction (turns), share of the weight. */
const LOCK_ARRIVALS = 8;
const LOCK_SESSIONS = 4;
const LOCK_USED = 0.75;
const LOCK_SPREAD_TURNS = 0.1;
const LOCK_SHARE = 0.98;
/** Share of losses that hide a step in frequency (common practice, no source). */
const HIDDEN_STEP_SHARE = 0.05;
/** σ of a step of ν̇ that may go with it, relative. */
const HIDDEN_RATE_STEP = 0.03;
/** σ of the deviation of which nothing is known. */
const ANY_TURN = 1;
const START_SPREAD_TURNS = 0.05;
const SEARCH_SPREAD_TURNS = 0.1;
const KEEP = 12;
const ALL_KEEP = 32;
const SECONDS_PER_DAY = 86_400;

export function newLoss(from: number, before: Snapshot): Loss {
  return { from, before, nextSearch: FIRST_SEARCH };
}

/** Tries again with the arrivals since the loss; ends the loss when one count has won. */
export function reacquire(watch: PulsarWatch, index: number): void {
  let loss = watch.lost!;
  if (index - loss.from >= PATIENCE_ARRIVALS) loss = newLoss(index - FRESH_ARRIVALS, loss.before);
  if (index + 1 - loss.from >= loss.nextSearch) {
    searchAnew(watch, loss, index);
    loss = { ...loss, nextSearch: Math.ceil((index + 1 - loss.from) * SEARCH_GROWTH) };
  }
  watch.lost = loss;
  if (!hasWon(watch, loss.from, index)) return;
  watch.lost = null;
  watch.locked = true;
  watch.lockedFrom = index + 1;
  watch.oldestGap = index + 1;
}

/** The bank made new from all rates that the arrivals since the loss allow. */
export function searchAnew(watch: PulsarWatch, loss: Loss, index: number): void {
  const start = released(watch, loss);
  const found = [start, ...searched(watch, loss, start, index)].flatMap((h) => followed(watch, h, loss.from, index));
  const beam = pruned(found, ALL_KEEP);
  const total = logWeightOf(beam);
  for (const h of beam) h.logWeight -= total;
  const at = { index, tDays: watch.line.seen[index]!.tDays };
  watch.bank = newBank(watch.noise, beam, at, watch.states.decays);
}

/** What was known, carried to the first arrival after the loss, whose deviation is taken as it was seen: no count is held. */
function released(watch: PulsarWatch, { from, before }: Loss): Hypothesis {
  const seen = watch.line.seen[from]!;
  const h = grownTo(watch, before.hypothesis);
  h.tracks = watch.bank!.beam[0]!.tracks;
  propagate(h, gapOf(seen.tDays - before.tDays, watch.noise, watch.states.decays));
  const size = h.mean.length;
  for (let i = 1; i < size; i++) {
    h.cov[i] = 0;
    h.cov[i * size] = 0;
  }
  freeSecond(h, HIDDEN_RATE_STEP * Math.abs(watch.model.spin.frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2);
  h.mean[0]! += seen.deviation - seenAs(watch, h, from).deviation;
  h.cov[0] = ANY_TURN ** 2;
  const outlook = seenAs(watch, h, from);
  absorb(h, outlook, 0, outlook.variance + arrivalVariance(seen.sigmaTurns, watch.noise));
  let { story } = before.hypothesis;
  // Arrivals between, when the search was begun anew with later ones.
  for (let i = before.index + 1; i <= from; i++)
    story = { index: i, turns: 0, used: i === from, slipped: false, before: story };
  return Object.assign(h, { story, logWeight: 0, lastSetAside: false, numbering: null });
}

/** Hypotheses at the peaks of the circular likelihood over the arrivals since the loss. */
function searched(watch: PulsarWatch, { from }: Loss, start: Hypothesis, index: number): Hypothesis[] {
  const { seen } = watch.line;
  const points = seen.slice(from, index + 1).map((s, i) => {
    const off = s.deviation - expectedDeviation(watch, start, seen[from]!.tDays, from + i);
    return { days: s.tDays - seen[from]!.tDays, deviation: off - Math.round(off) };
  });
  if (points.at(-1)!.days <= 0) return [];
  const size = start.mean.length;
  const sigma = Math.sqrt(start.cov[size + 1]!);
  const turnsPerDay = watch.model.spin.frequencyHz.hi * SECONDS_PER_DAY;
  const lowest = Math.min(LOWEST_STEP * turnsPerDay, -5 * sigma);
  const highest = Math.max(HIGHEST_STEP * turnsPerDay, 5 * sigma);
  return searchStep(points, lowest, highest, SEARCH_SPREAD_TURNS, BENDS).map((peak) => {
    const h = copyOf(start);
    const width = 2 * peak.width;
    const step = Math.max(Math.abs(peak.frequencyStep), width);
    const asWalk = Math.exp(-0.5 * (peak.frequencyStep / sigma) ** 2) / sigma;
    const asStep = (HIDDEN_STEP_SHARE * Math.sqrt(2 * Math.PI)) / (LOG_SIZE_RANGE * step);
    h.logWeight += Math.log(width * (asWalk + asStep));
    h.mean[0]! += peak.phase;
    h.cov[0]! += START_SPREAD_TURNS ** 2;
    h.mean[1]! -= peak.frequencyStep;
    h.mean[2]! += peak.curvature;
    const span = points.at(-1)!.days;
    h.cov[2 * size + 2]! += ((2 * BEND_STEP_TURNS) / (span * span)) ** 2;
    h.logWeight += logBendPrior(0.5 * peak.curvature * span * span) + Math.log(BEND_STEP_TURNS);
    for (let i = 0; i < size; i++) {
      h.cov[size + i] = 0;
      h.cov[i * size + 1] = 0;
    }
    h.cov[size + 1] = width * width;
    return h;
  });
}

function followed(watch: PulsarWatch, start: Hypothesis, from: number, index: number): Hypothesis[] {
  const { seen } = watch.line;
  let beam = [start];
  for (let i = from + 1; i <= index; i++) {
    const gap = gapOf(seen[i]!.tDays - seen[i - 1]!.tDays, watch.noise, watch.states.decays);
    for (const h of beam) propagate(h, gap);
    beam = observe(beam, observationOf(watch.line, i, watch.states, watch.noise), KEEP, watch.bank!.scratch);
  }
  return beam;
}

function hasWon(watch: PulsarWatch, from: number, index: number): boolean {
  const best = watch.bank!.beam[0]!;
  const arrivals = index + 1 - from;
  const sessions = watch.line.seen[index]!.session + 1 - watch.line.seen[from]!.session;
  if (arrivals < LOCK_ARRIVALS || sessions < LOCK_SESSIONS || best.lastSetAside) return false;
  let used = 0;
  for (let s = best.story; s !== null && s.index >= from; s = s.before) if (s.used) used++;
  return (
    used >= LOCK_USED * arrivals &&
    Math.sqrt(seenAs(watch, best, index).variance) < LOCK_SPREAD_TURNS &&
    shareOfCount(watch, best) > LOCK_SHARE
  );
}
