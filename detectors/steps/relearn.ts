/** Learning the noise anew, and going through the past again with what was learned. */

import type { Disturbance } from '../filter/countedArrival.ts';
import { learnNoise } from '../filter/noiseLearning.ts';
import { withMargin } from '../filter/noiseMargin.ts';
import { newBank } from './bank.ts';
import { logWeightOf, pruned } from './beam.ts';
import { oddsInBestShape } from './bestShape.ts';
import { bestOf, countedArrivals, disturbances } from './counts.ts';
import { withoutRecoveries } from './establishedRecoveries.ts';
import { spreadOf, weigh } from './evidence.ts';
import type { Hypothesis, Story } from './hypothesis.ts';
import { leastJointOdds } from './jointOdds.ts';
import { endTrial, runStart } from './largeStep.ts';
import { seekSwitching } from './modeSwitching.ts';
import { asFixed, type PulsarWatch } from './pulsarWatch.ts';
import { retimeRecovery } from './recoveryTimescales.ts';
import { decisionsOf, retrace } from './retrace.ts';
import { shareOfCount } from './sameCount.ts';
import { foundStartRate, startBeam } from './start.ts';
import { stepAt } from './stepAt.ts';
import { isSwitch } from './switchingRecord.ts';
import { sessionsUntil } from './timeline.ts';
import { isRefuted, overlaps, type Track } from './track.ts';

/** The noise is learned when the arrivals have grown by this factor. */
const LEARNING_GROWTH = 1.4;
/** An open question may hold learning back for so long. */
const PATIENCE = 1.4;
const SURE_SHARE = 0.95;
/** So many of the latest events are asked again whether they are events. */
const LAST_EVENTS = 4;
/** Natural-log odds from which a step is kept out of the noise. */
const POSSIBLE = -3;

export function learningDue(watch: PulsarWatch, index: number): boolean {
  const count = index + 1;
  if (count < watch.nextLearning || watch.largeStep !== null) return false;
  if (count >= PATIENCE * watch.nextLearning) return true;
  const best = watch.bank!.beam[0]!;
  const open = watch.tracks.some((t) => t.state === 'suspected' || (t.confirmedAt !== null && !t.settled));
  return !open && !best.lastSetAside && shareOfCount(watch, best) > SURE_SHARE;
}

export function relearn(watch: PulsarWatch, index: number): void {
  watch.nextLearning = Math.ceil((index + 1) * LEARNING_GROWTH);
  seekSwitching(watch, index);
  const best = bestOf(watch);
  takeBack(watch, best);
  const counted = withoutRecoveries(watch, countedArrivals(watch, best));
  const known = [...disturbances(watch), ...candidate(watch)];
  const learned = learnNoise(counted, known, watch.prior, watch.noise);
  watch.likelyNoise = asFixed(watch.model, learned);
  watch.noise = asFixed(
    watch.model,
    withMargin(learned, counted, known, watch.prior, sessionsUntil(watch.line, index)),
  );
  retimeRecovery(watch);
  rebuild(watch, index, best, foundStartRate(counted));
}

/** A step that may be under way, though not yet worth a suspicion: it is not learned as noise. */
function candidate(watch: PulsarWatch): Disturbance[] {
  const { strongest, something, nothing } = weigh(watch.bank!);
  if (strongest !== 'glitch' || something - nothing < POSSIBLE) return [];
  const spread = spreadOf(watch.bank!, strongest);
  if (watch.tracks.some((track) => isRefuted(track) && overlaps(track, spread))) return [];
  return [{ kind: 'spin', beforeIndex: spread.bestGap }];
}

/** The recovery followed with a timescale that suits it better: the past gone through again, with the noise as it is. */
export function followRecovery(watch: PulsarWatch, index: number): boolean {
  if (!retimeRecovery(watch)) return false;
  const best = watch.bank!.beam[0]!;
  rebuild(watch, index, best, foundStartRate(countedArrivals(watch, best)));
  return true;
}

/** A step has turned out to be a slow rise: the arrivals that did not fit the step are taken in again. */
export function followRise(watch: PulsarWatch, index: number, track: Track): void {
  const best = bestOf(watch);
  const run = Math.max(track.bestGap, runStart(best, index, watch.lockedFrom));
  let story: Story | null = null;
  for (const s of decisionsOf(best)) story = { ...s, used: s.used || s.index >= run, before: story };
  watch.oldestGap = index + 1;
  endTrial(watch);
  rebuild(watch, index, { ...best, story }, foundStartRate(countedArrivals(watch, best)));
}

/** A confirmed event that more arrivals have shown to be noise is withdrawn, and what it hid is learned. */
function takeBack(watch: PulsarWatch, best: Hypothesis): void {
  const confirmed = watch.tracks
    .filter((t) => t.state === 'confirmed' && t.kind !== 'lost count' && !isSwitch(watch, t))
    .slice(-LAST_EVENTS);
  for (const track of confirmed) {
    const logOdds = oddsInBestShape(watch, track, best);
    const least = leastJointOdds(watch, track);
    if (logOdds < (Number.isFinite(least) ? least - watch.settings.suspectLogOdds : 0))
      Object.assign(track, { state: 'withdrawn', logOdds, settled: true } satisfies Partial<Track>);
  }
}

/**
 * Goes through all arrivals again: up to the window with the count that has won, then with the whole bank. Nothing is
 * decided on the way.
 */
function rebuild(watch: PulsarWatch, index: number, best: Hypothesis, startRate: number): void {
  const decisions = decisionsOf(best);
  const belief = { noise: watch.noise, tracks: watch.tracks.filter((t) => t.state === 'confirmed') };
  const windowStart = Math.max(watch.oldestGap, index - watch.settings.windowArrivals + 1, 1);
  const beam = startBeam(watch, startRate);
  for (let i = 1; i < Math.min(windowStart, index + 1); i++)
    for (const b of beam) retrace(watch, b, decisions[i]!, belief);
  // All start errors go on: how far the model's ν̇ was off may not be settled for a hundred arrivals.
  const at = { index: windowStart - 1, tDays: watch.line.seen[windowStart - 1]!.tDays };
  watch.bank = newBank(watch.noise, normalised(beam), at, watch.states.decays);
  for (let i = windowStart; i <= index; i++) stepAt(watch, i, watch.locked);
}

function normalised(beam: Hypothesis[]): Hypothesis[] {
  const kept = pruned(beam, beam.length);
  const total = logWeightOf(kept);
  for (const h of kept) h.logWeight -= total;
  return kept;
}
