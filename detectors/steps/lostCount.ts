/**
 * Whether the count of turns still holds. After a long gap, or when the noise has grown, no prediction may be left that
 * tells one count from the next; or a run of arrivals fits nothing. Then the count is lost: said once, and found again.
 */

import type { Snapshot } from './bank.ts';
import { logWeightOf } from './beam.ts';
import { bestOf } from './counts.ts';
import { explanationsOf, weigh } from './evidence.ts';
import { copyOf } from './hypothesis.ts';
import { endTrial, runStart } from './largeStep.ts';
import { newTrack } from './newTrack.ts';
import { expectedSpread } from './outlook.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { newLoss, searchAnew } from './reacquire.ts';
import { shareOfCount } from './sameCount.ts';

/** A gap after which counts may be in doubt: the arrivals since it must settle them. */
export interface Doubt {
  readonly from: number;
  readonly before: Snapshot;
}

/** Spread of the prediction (turns) from which counts are in doubt, and from which the beam cannot hold them all. */
const DOUBT_SPREAD_TURNS = 0.25;
const LOST_SPREAD_TURNS = 1.2;
/** One count that holds so much of the weight has won; with less than that the others are comparable. */
const SURE_SHARE = 0.98;
const UNSURE_SHARE = 0.9;
const SURE_SESSIONS = 2;
/** Sessions that a doubt may last: with comparable counts, and at all. */
const UNSURE_SESSIONS = 5;
const LONGEST_DOUBT_SESSIONS = 12;
/** A run that fits nothing: arrivals and sessions of it. The search for a large step has had its tries by then. */
const LOST_RUN = 12;
const LOST_RUN_SESSIONS = 6;
const FRESH_ARRIVALS = 10;
/** Lost again within so many arrivals of its being found: one loss. */
const SAME_LOSS_ARRIVALS = 30;

/** After each arrival of a locked pulsar. */
export function watchCount(watch: PulsarWatch, index: number): void {
  const { seen } = watch.line;
  const run = runStart(bestOf(watch), index, watch.lockedFrom);
  if (index + 1 - run >= LOST_RUN && sessionsFrom(watch, run, index) >= LOST_RUN_SESSIONS) {
    lose(watch, doubtFrom(watch, run), index);
    return;
  }
  // While the size of a large step is open, its trial keeps the counts.
  if ((watch.largeStep?.track ?? null) !== null) return;
  if (watch.doubt === null) {
    const spread = predictedSpread(watch, index);
    if (spread < DOUBT_SPREAD_TURNS || seen[index]!.arrival.pulseNumber !== null) return;
    watch.doubt = doubtFrom(watch, index);
    if (spread > LOST_SPREAD_TURNS && !isFresh(watch, index)) lose(watch, watch.doubt, index);
    return;
  }
  const sessions = sessionsFrom(watch, watch.doubt.from, index);
  const share = shareOfBestCount(watch);
  if (share > SURE_SHARE && sessions > SURE_SESSIONS && !bestOf(watch).lastSetAside) watch.doubt = null;
  else if (sessions > LONGEST_DOUBT_SESSIONS || (sessions > UNSURE_SESSIONS && share < UNSURE_SHARE))
    lose(watch, watch.doubt, index);
}

/** A glitch so recent that its recovery, not the pulsar's noise, may spread the prediction. */
function isFresh(watch: PulsarWatch, index: number): boolean {
  return watch.tracks.some(
    (t) => t.kind === 'glitch' && t.state === 'confirmed' && index - t.confirmedAt! < FRESH_ARRIVALS,
  );
}

function sessionsFrom(watch: PulsarWatch, from: number, index: number): number {
  return watch.line.seen[index]!.session + 1 - watch.line.seen[from]!.session;
}

/** The last state known before arrival `from`, or before an earlier one where that is no longer kept. */
function doubtFrom(watch: PulsarWatch, from: number): Doubt {
  const { snapshots } = watch.bank!;
  const before = snapshots.findLast((s) => s.index < from) ?? snapshots[0]!;
  return { from: before.index + 1, before };
}

/**
 * σ (turns) with which arrival `index` was predicted, for its receiver or for the one before: what is not known of a
 * receiver's offset hides no turn of the pulsar.
 */
function predictedSpread(watch: PulsarWatch, index: number): number {
  const before = watch.bank!.snapshots.findLast((s) => s.index < index);
  if (before === undefined) return 0;
  const spreadAs = (as: number) => expectedSpread(watch, before.hypothesis, before.tDays, index, as);
  return Math.min(spreadAs(index), spreadAs(index - 1));
}

/** Share of the weight of the whole bank that agrees with the heaviest hypothesis on the count. */
function shareOfBestCount(watch: PulsarWatch): number {
  const { beam, families } = watch.bank!;
  return shareOfCount(watch, bestOf(watch), [...beam, ...families.flatMap((family) => family.beam)]);
}

/** The count is gone: one record says so, events that rest on it are taken back, and the search begins. */
function lose(watch: PulsarWatch, doubt: Doubt, index: number): void {
  // A large step whose size was never settled: nothing since it is known.
  const unsettled = (watch.largeStep?.track ?? null) === null ? null : watch.largeStep;
  const { from, before } = unsettled === null ? doubt : { from: unsettled.start, before: unsettled.before };
  const explanations = explained(watch, from);
  const open = watch.tracks.find((t) => t.state === 'suspected');
  const own = open !== undefined && open.lastGap >= from ? open : undefined;
  for (const track of watch.tracks) {
    const isVoid =
      track !== own &&
      track.kind !== 'lost count' &&
      (track === open || (track.state === 'confirmed' && track.bestGap >= from));
    if (isVoid) Object.assign(track, { state: 'withdrawn', settled: true });
  }
  const track = own ?? newTrack(watch, index);
  const former = watch.tracks.findLast((t) => t !== track && t.kind === 'lost count');
  const share = Math.max(1e-9, Math.min(explanations['lost count']!, 1 - 1e-9));
  Object.assign(track, {
    kind: 'lost count',
    state: 'confirmed',
    bestGap: from,
    firstGap: from,
    lastGap: from,
    confirmedAt: index,
    logOdds: Math.log(share / (1 - share)),
    explanations,
    // A count that did not hold was never found: the loss goes on.
    partOf:
      former !== undefined && index - watch.oldestGap < SAME_LOSS_ARRIVALS ? (former.partOf ?? former.number) : null,
    settled: true,
  });
  endTrial(watch);
  watch.locked = false;
  watch.doubt = null;
  const hypothesis = copyOf(before.hypothesis, [...before.hypothesis.tracks, track.number]);
  watch.lost = newLoss(from, { ...before, hypothesis });
  watch.bank!.beam[0]!.tracks = hypothesis.tracks;
  searchAnew(watch, watch.lost, index);
}

/** What the bank says of the arrivals since `from`; whatever calls them quiet or bad does so with a count it does not know. */
function explained(watch: PulsarWatch, from: number): Record<string, number> {
  const bank = watch.bank!;
  const evidence = weigh(bank);
  const shares = explanationsOf(bank, evidence, from, (i) => watch.line.seen[i]!.session);
  const lost = Math.exp(logWeightOf(bank.beam));
  const kinds = [...evidence.byKind.keys()].map((kind) => [kind, shares[kind]!] as const);
  const events = kinds.reduce((sum, [, share]) => sum + share, 0);
  return events + lost === 0 ? { 'lost count': 1 } : { ...Object.fromEntries(kinds), 'lost count': 1 - events };
}
