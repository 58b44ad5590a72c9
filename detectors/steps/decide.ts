/** From weights to states: suspected at a low threshold, confirmed at the budget's, withdrawn when the evidence goes. */

import { logAddExp } from '../math/logSumExp.ts';
import { mjdNumber } from '../time/mjd.ts';
import { collapse } from './bank.ts';
import { explanationsOf, sessionsUsed, spreadOf, weigh } from './evidence.ts';
import type { Hypothesis } from './hypothesis.ts';
import { jointOdds } from './jointOdds.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { expectRecovery, looseRecovery } from './recoveryStates.ts';
import { overlaps, type Track } from './track.ts';

/** A confirmed event's explanation must hold at least this share against the other explanations. */
const EXPLANATION_SHARE = 0.99;
const LEAST_SESSIONS = 2;
/** The second weighing goes through the whole record: a long one is not asked again at each arrival. */
const ARRIVALS_PER_QUESTION = 400;

export function decide(watch: PulsarWatch, index: number): void {
  for (const track of watch.tracks) if (track.confirmedAt !== null && !track.settled) reconsider(watch, track);
  suspect(watch, index);
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
  track.logOdds = holding - denying;
  if (track.logOdds < 0) track.state = 'withdrawn';
  else if (track.state === 'withdrawn' && track.logOdds > watch.settings.confirmLogOdds) track.state = 'confirmed';
  if (holding === -Infinity) track.settled = true;
}

function suspect(watch: PulsarWatch, index: number): void {
  const bank = watch.bank!;
  const evidence = weigh(bank);
  const open = watch.tracks.find((t) => t.state === 'suspected');
  const odds = evidence.something - evidence.nothing;
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
  const track = open ?? reopened(watch, spread) ?? newTrack(watch, index);
  const sessionOf = (i: number) => watch.line.seen[i]!.session;
  Object.assign(track, spread, {
    kind,
    state: 'suspected',
    logOdds: odds,
    explanations: explanationsOf(bank, evidence, spread.firstGap, sessionOf),
  } satisfies Partial<Track>);
  const weight = evidence.byKind.get(kind)!;
  if (weight - evidence.nothing < watch.settings.confirmLogOdds || weight < Math.log(EXPLANATION_SHARE)) return;
  const families = bank.families.filter((f) => f.kind === kind);
  const bestFamily = families.find((f) => f.gap === spread.bestGap)!;
  const holder = bestFamily.beam.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  if (sessionsUsed(holder, spread.bestGap, sessionOf) < LEAST_SESSIONS) return;
  if (index < track.askAgainAt) return;
  const joint = jointOdds(watch, track, holder);
  if (joint < watch.settings.confirmLogOdds) {
    track.logOdds = Math.min(track.logOdds, joint);
    track.askAgainAt = index + 1 + Math.floor(index / ARRIVALS_PER_QUESTION);
    return;
  }
  track.state = 'confirmed';
  track.confirmedAt ??= index;
  believe(watch, track);
  watch.oldestGap = index + 1;
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
    for (const h of winners) looseRecovery(h, bank.decays, track.rateStep);
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

function newTrack(watch: PulsarWatch, index: number): Track {
  const day = Math.floor(mjdNumber(watch.line.seen[index]!.arrival.tdb));
  const stem = `${watch.model.name.replace(/\s+/g, '')}-${day}`;
  const same = watch.tracks.filter((t) => t.id === stem || t.id.startsWith(`${stem}.`)).length;
  const track: Track = {
    number: watch.tracks.length,
    id: same === 0 ? stem : `${stem}.${same + 1}`,
    kind: 'glitch',
    state: 'suspected',
    bestGap: index,
    firstGap: index,
    lastGap: index,
    suspectedAt: index,
    confirmedAt: null,
    rateStep: 0,
    askAgainAt: 0,
    logOdds: 0,
    explanations: {},
    settled: false,
  };
  watch.tracks.push(track);
  return track;
}
