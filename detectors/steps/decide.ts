/** From weights to states: suspected at a low threshold, confirmed at the budget's, withdrawn when the evidence goes. */

import { logAddExp, logRatio } from '../math/logSumExp.ts';
import { requiredLogOdds } from '../nulls/ownNull.ts';
import { collapse } from './bank.ts';
import { oddsInBestShape } from './bestShape.ts';
import { explanationsOf, isExplained, sessionsUsed, spreadOf, weigh } from './evidence.ts';
import type { Hypothesis } from './hypothesis.ts';
import { leastJointOdds } from './jointOdds.ts';
import { seekSwitching } from './modeSwitching.ts';
import { newTrack } from './newTrack.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { expectRecovery, FRESH_RECOVERY_SHARE, looseRecovery } from './recoveryStates.ts';
import { followRecovery, relearn } from './relearn.ts';
import { reshape, shape } from './reshape.ts';
import { logSignWeight } from './signPrior.ts';
import { switchingRecord } from './switchingRecord.ts';
import { isRefuted, overlaps, type Track } from './track.ts';

export const LEAST_SESSIONS = 2;
/** The second weighing goes through the whole record: a long one is not asked again at each arrival. */
const ARRIVALS_PER_QUESTION = 400;
/** Where noise is the better explanation, the arrivals since the gap must grow by this share before it is asked again. */
const PATIENCE_AFTER_REFUSAL = 0.15;

export function decide(watch: PulsarWatch, index: number): void {
  for (const track of watch.tracks) if (track.confirmedAt !== null && !track.settled) reconsider(watch, track);
  // While the size of a large step is open, what does not fit speaks for another size, not for another event.
  if ((watch.largeStep?.track ?? null) === null) suspect(watch, index);
  if (reshape(watch, index) && watch.largeStep === null) relearn(watch, index);
}

/** An event that was confirmed stays under trial for as long as a hypothesis without it is alive. */
function reconsider(watch: PulsarWatch, track: Track): void {
  const bank = watch.bank!;
  let holding = -Infinity;
  let denying = -Infinity;
  const count = (h: Hypothesis) => {
    if (h.tracks.includes(track.number)) holding = logAddExp(holding, h.logWeight);
    else denying = logAddExp(denying, h.logWeight);
  };
  bank.beam.forEach(count);
  for (const family of bank.families) family.beam.forEach(count);
  if (denying === -Infinity) {
    track.settled = true;
    return;
  }
  track.logOdds = logRatio(holding, denying);
  if (track.logOdds < 0) track.state = 'withdrawn';
  else if (track.state === 'withdrawn' && track.logOdds > watch.settings.confirmLogOdds) track.state = 'confirmed';
  if (holding === -Infinity) track.settled = true;
}

function suspect(watch: PulsarWatch, index: number): void {
  const bank = watch.bank!;
  const evidence = weigh(bank);
  const open = watch.tracks.find((t) => t.state === 'suspected');
  const odds = logRatio(evidence.something, evidence.nothing);
  if (evidence.strongest === null || odds < watch.settings.suspectLogOdds) {
    if (open !== undefined) {
      open.logOdds = odds;
      if (odds < 0) open.state = 'withdrawn';
    }
    if (open === undefined || open.state === 'withdrawn') return;
  }
  const kind = evidence.strongest;
  if (kind === null) return;
  const spread = spreadOf(bank, kind);
  const known = open ?? reopened(watch, spread);
  if (known?.state === 'withdrawn' && index < known.askAgainAt) return;
  const track = known ?? newTrack(watch, index);
  const sessionOf = (i: number) => watch.line.seen[i]!.session;
  Object.assign(track, spread, {
    kind,
    state: 'suspected',
    logOdds: odds,
    explanations: explanationsOf(bank, evidence, spread.firstGap, sessionOf),
  } satisfies Partial<Track>);
  track.partOf = (kind === 'spin-down-rate change' ? switchingRecord(watch)?.number : null) ?? null;
  const weight = evidence.byKind.get(kind)!;
  const gained = weight - evidence.nothing;
  if (gained + Math.LN2 < watch.settings.confirmLogOdds || !isExplained(evidence, kind)) return;
  const families = bank.families.filter((f) => f.kind === kind);
  const bestFamily = families.find((f) => f.gap === spread.bestGap)!;
  const holder = bestFamily.beam.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  if (sessionsUsed(holder, spread.bestGap, sessionOf) < LEAST_SESSIONS) return;
  // While the counts after a gap are in doubt, a step would only stand for a wrong one.
  if (watch.doubt !== null) return;
  if (index < track.askAgainAt || (watch.largeStep === null && followRecovery(watch, index))) return;
  const sign = logSignWeight(watch, track);
  if (gained + sign < watch.settings.confirmLogOdds) return;
  const joint = oddsInBestShape(watch, track, holder) + sign;
  const demands = { sessions: LEAST_SESSIONS, leastJointOdds: leastJointOdds(watch, track) };
  const decisive = joint >= demands.leastJointOdds ? gained + sign : joint;
  // Not a number either: what cannot be weighed is not confirmed.
  if (!(decisive >= requiredLogOdds(watch, Math.min(decisive, gained + sign), demands))) {
    refuse(watch, track, index, joint);
    if (watch.largeStep === null && (isRefuted(track) || seekSwitching(watch, index))) relearn(watch, index);
    return;
  }
  shape(watch, track, holder, joint);
  track.state = 'confirmed';
  track.confirmedAt ??= index;
  if (watch.largeStep !== null && kind === 'glitch') watch.largeStep.track = track.number;
  believe(watch, track);
  watch.oldestGap = index + 1;
  if (watch.largeStep === null && seekSwitching(watch, index)) relearn(watch, index);
}

/** Noise explains it as well: no longer suspected, unless more arrivals speak for it. */
function refuse(watch: PulsarWatch, track: Track, index: number, joint: number): void {
  if (joint < track.logOdds) track.logOdds = joint;
  track.askAgainAt = index + 1 + Math.floor(index / ARRIVALS_PER_QUESTION);
  if (joint >= watch.settings.suspectLogOdds) return;
  track.state = 'withdrawn';
  if (joint < 0) track.askAgainAt += Math.ceil(PATIENCE_AFTER_REFUSAL * (index - track.bestGap));
}

/** The hypotheses of the event become the null; the best of the others stay beside them, to take it back if need be. */
function believe(watch: PulsarWatch, track: Track): void {
  if (track.kind === 'glitch') expectRecovery(watch);
  const bank = watch.bank!;
  const winners: Hypothesis[] = [];
  const dissenters: Hypothesis[] = [...bank.beam];
  for (const family of bank.families) {
    if (family.kind !== track.kind) dissenters.push(...family.beam);
    else for (const h of family.beam) winners.push({ ...h, tracks: [...h.tracks, track.number] });
  }
  if (track.kind === 'glitch') {
    const best = winners.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
    track.rateStep = Math.abs(best.mean[1]! - bank.beam[0]!.mean[1]!);
    for (const h of winners) looseRecovery(h, bank.decays, FRESH_RECOVERY_SHARE * track.rateStep);
  }
  collapse(bank, winners, dissenters);
}

/** The same suspicion again, after it had gone: one physical event is one record. */
function reopened(watch: PulsarWatch, spread: Parameters<typeof overlaps>[1]): Track | undefined {
  const last = watch.tracks.at(-1);
  return last !== undefined && last.state === 'withdrawn' && last.confirmedAt === null && overlaps(last, spread)
    ? last
    : undefined;
}
