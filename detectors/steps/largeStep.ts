/**
 * A run of arrivals that fit nothing: seeks a large step by the circular search and hands what it finds to the bank. Before
 * a pulsar is locked the same search corrects a start model that is too far off.
 */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import type { Snapshot } from './bank.ts';
import { logWeightOf, observe, pruned } from './beam.ts';
import { RATE_PER_YEAR } from './births.ts';
import { type SearchPeak, searchStep } from './circularSearch.ts';
import { copyOf, gapOf, type Hypothesis, propagate } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { observationOf } from './timeline.ts';

const LEAST_RUN = 4;
const LEAST_RUN_DAYS = 0.5;
/** Searched again when the run has grown by this factor. */
const RUN_GROWTH = 1.4;
/** Δν/ν searched. */
const LOWEST_STEP = -1e-5;
const HIGHEST_STEP = 5e-5;
/** Sizes are log-uniform over 1e-9…1e-4 of ν. */
const LOG_RANGE = Math.log(1e5);
const START_SPREAD_TURNS = 0.05;
/** Start models whose frequency is off by more than their stated errors allow (common practice, no source). */
const WRONG_START_SHARE = 0.05;
const DAYS_PER_YEAR = 365.25;
const KEEP = 10;

/** Of a run, so many may have been taken for good by chance. */
const LEAST_SHARE_SET_ASIDE = 0.7;
const LONGEST_RUN = 40;

/** Where the run of arrivals that the hypothesis cannot explain began: most since then were set aside. */
function runStart(h: Hypothesis, index: number): number {
  let start = index + 1;
  let setAside = 0;
  for (let s = h.story; s !== null && index - s.index < LONGEST_RUN; s = s.before) {
    if (s.used) continue;
    setAside++;
    if (setAside >= LEAST_SHARE_SET_ASIDE * (index + 1 - s.index)) start = s.index;
  }
  return start;
}

/** Adds what it finds to the bank; does nothing while the latest arrivals fit. */
export function searchLargeStep(watch: PulsarWatch, index: number): void {
  const bank = watch.bank!;
  const { seen } = watch.line;
  const start = runStart(bank.beam[0]!, index);
  const run = index + 1 - start;
  if (run < LEAST_RUN) {
    watch.nextSearch = LEAST_RUN;
    return;
  }
  if (run < watch.nextSearch || seen[index]!.tDays - seen[start]!.tDays < LEAST_RUN_DAYS) return;
  watch.nextSearch = Math.ceil(run * RUN_GROWTH);
  const before = bank.snapshots.find((s) => s.index === start - 1);
  if (before === undefined) return;
  const turnsPerDay = watch.model.spin.frequencyHz.hi * 86_400;
  const points = seen.slice(start, index + 1).map((s) => ({
    days: s.tDays - seen[start]!.tDays,
    deviation: wrapped(s.deviation - predictedDeviation(before, s.tDays)),
  }));
  const spread = predictionSpread(watch, before, seen[index]!.tDays);
  const peaks = searchStep(points, LOWEST_STEP * turnsPerDay, HIGHEST_STEP * turnsPerDay, spread);
  const found = peaks.flatMap((peak) => followed(watch, before, peak, start, index));
  if (found.length === 0) return;
  for (const h of found) h.logWeight -= bank.logScale;
  if (!watch.locked) {
    // Before the lock it is the start model that is wrong, not the pulsar that has changed.
    bank.beam = pruned([...bank.beam, ...found], bank.beam.length + found.length);
    return;
  }
  const family = bank.families.find((f) => f.gap === start && f.kind === 'glitch');
  if (family) {
    family.beam.push(...found);
    family.logWeight = logWeightOf(family.beam);
  } else bank.families.push({ kind: 'glitch', gap: start, beam: found, logWeight: logWeightOf(found) });
}

function predictedDeviation(from: Snapshot, tDays: number): number {
  const t = tDays - from.tDays;
  const { mean } = from.hypothesis;
  return mean[0]! + t * mean[1]! + (t * t * mean[2]!) / 2;
}

/** σ of the prediction at the end of the run, turns. */
function predictionSpread(watch: PulsarWatch, from: Snapshot, tDays: number): number {
  const h = copyOf(from.hypothesis);
  propagate(h, gapOf(tDays - from.tDays, watch.noise, watch.states.decays));
  return Math.sqrt(h.cov[0]!);
}

function wrapped(turns: number): number {
  return turns - Math.round(turns);
}

/** The hypothesis of one peak, taken through the run. */
function followed(watch: PulsarWatch, from: Snapshot, peak: SearchPeak, start: number, index: number): Hypothesis[] {
  const { seen } = watch.line;
  const gapDays = seen[start]!.tDays - from.tDays;
  const h = copyOf(from.hypothesis);
  propagate(h, gapOf(gapDays, watch.noise, watch.states.decays));
  const size = h.mean.length;
  h.mean[0]! += peak.phase;
  h.mean[1]! -= peak.frequencyStep;
  // The epoch is open, so the deviation after the gap is too; the peak's width is the spread of the rate.
  for (let i = 1; i < size; i++) {
    h.cov[i] = 0;
    h.cov[i * size] = 0;
  }
  h.cov[0] = START_SPREAD_TURNS ** 2;
  h.cov[size + 1]! += (2 * peak.width) ** 2;
  const rateStep = 0.01 * Math.abs(watch.model.spin.frequencyDerivativeHzPerS) * 86_400 ** 2;
  h.cov[(SPIN_STATES - 1) * (size + 1)]! += rateStep * rateStep;
  const rootTwoPi = Math.sqrt(2 * Math.PI);
  const stepOrWidth = Math.max(Math.abs(peak.frequencyStep), peak.width);
  h.logWeight +=
    Math.log(watch.locked ? (RATE_PER_YEAR.glitch * gapDays) / DAYS_PER_YEAR : WRONG_START_SHARE) +
    Math.log(Math.min(1, (rootTwoPi * 2 * peak.width) / (LOG_RANGE * stepOrWidth))) +
    Math.log(rootTwoPi * START_SPREAD_TURNS);
  let beam: Hypothesis[] = [h];
  for (let i = start; i <= index; i++) {
    if (i > start) {
      const gap = gapOf(seen[i]!.tDays - seen[i - 1]!.tDays, watch.noise, watch.states.decays);
      for (const b of beam) propagate(b, gap);
    }
    beam = observe(beam, observationOf(watch.line, i, watch.states, watch.noise), KEEP, watch.bank!.scratch);
  }
  return beam.slice(0, 3);
}
