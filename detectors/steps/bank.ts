/**
 * The bank: the null beam (nothing new has happened) and, for each recent gap between arrivals and each explanation, a
 * beam of its own, so that a small step is not pruned before its evidence has grown. Those for which nothing speaks wait
 * and cost next to nothing (waiting.ts); the others are carried through each arrival.
 */

import type { NoiseModel } from '../report.ts';
import { logWeightOf, type Observation, observe, pruned } from './beam.ts';
import type { BirthPlace, Cause, Kind } from './births.ts';
import { type Family, newFamily, observeFamily } from './family.ts';
import {
  copyOf,
  type Decay,
  type Gap,
  gapOf,
  type Hypothesis,
  type Prediction,
  propagate,
  withState,
} from './hypothesis.ts';
import { enterGap, type Leader, lookAhead, newLeader, newPrediction, withOneMoreStateSeen } from './leader.ts';
import { carryOver } from './signatures.ts';
import { release, summon } from './summons.ts';
import {
  FAMILY_FLOOR_NATS,
  type Passage,
  passageWithOneMoreState,
  recall,
  type WaitingGap,
  waitingGap,
  withOneMoreState,
} from './waiting.ts';

/** The heaviest null hypothesis after an arrival, kept to search back from. */
export interface Snapshot {
  readonly index: number;
  readonly tDays: number;
  readonly hypothesis: Hypothesis;
}

export interface Bank {
  noise: NoiseModel;
  beam: Hypothesis[];
  /** How many null hypotheses are kept. */
  width: number;
  /** The families that are carried. */
  families: Family[];
  /** Gaps, oldest first, whose other families wait; and the arrivals since the first of them. */
  waiting: WaitingGap[];
  passages: Passage[];
  leader: Leader;
  /** Natural log that all weights have been divided by so far. */
  logScale: number;
  snapshots: Snapshot[];
  /** Recoveries from glitches that are believed. */
  readonly decays: readonly Decay[];
  readonly scratch: Prediction;
}

export const NULL_BEAM = 16;
const SNAPSHOTS = 64;

/** A bank whose hypotheses have seen the arrivals up to the one of `at`. */
export function newBank(
  noise: NoiseModel,
  beam: Hypothesis[],
  at: { readonly index: number; readonly tDays: number },
  decays: readonly Decay[],
): Bank {
  const [best] = beam as [Hypothesis];
  return {
    noise,
    beam,
    width: NULL_BEAM,
    families: [],
    waiting: [],
    passages: [],
    leader: newLeader(best),
    logScale: 0,
    snapshots: [{ ...at, hypothesis: copyOf(best) }],
    decays,
    scratch: newPrediction(best.mean.length),
  };
}

/** One more nuisance in every hypothesis: a receiver or a band seen for the first time. */
export function addState(bank: Bank, variance: number): Bank {
  const grow = (h: Hypothesis) => withState(h, variance);
  const beam = bank.beam.map(grow);
  return {
    ...bank,
    beam,
    families: bank.families.map((f) => ({ ...f, beam: f.beam.map(grow) })),
    waiting: bank.waiting.map((gap) => withOneMoreState(gap, variance)),
    passages: bank.passages.map(passageWithOneMoreState),
    leader: withOneMoreStateSeen(bank.leader),
    snapshots: bank.snapshots.map((s) => ({ ...s, hypothesis: grow(s.hypothesis) })),
    scratch: newPrediction(beam[0]!.mean.length),
  };
}

/** What one step of the bank is given. `place` is null while nothing may be born (not yet locked, rebuilding). */
export interface BankStep {
  readonly seen: Observation;
  readonly tDays: number;
  readonly gapDays: number;
  /** Of what is not known of a step of the site's clock in the gap, turns². */
  readonly clockVariance: number;
  readonly place: BirthPlace | null;
  readonly oldestGap: number;
  /** Every family is carried from its birth: the same answer, slowly. */
  readonly carryAll: boolean;
}

export function stepBank(bank: Bank, step: BankStep): void {
  const { seen } = step;
  const gap = gapOf(step.gapDays, bank.noise, bank.decays, step.clockVariance);
  if (!step.carryAll) release(bank, seen.index);
  carry(bank, gap);
  if (step.place !== null) giveBirth(bank, step.place, seen.index);
  if (bank.waiting.length > 0) bank.passages.push({ gap, seen, heaviest: -Infinity });
  lookAhead(bank.leader, bank.beam[0]!, seen);
  bank.beam = observe(bank.beam, seen, bank.width, bank.scratch);
  const last = { page: null };
  for (const family of bank.families) observeFamily(family, seen, bank.scratch, last);
  summon(bank, seen, step.carryAll);
  settle(bank, step.oldestGap);
  bank.snapshots.push({ index: seen.index, tDays: step.tDays, hypothesis: absoluteCopy(bank, bank.beam[0]!) });
  if (bank.snapshots.length > SNAPSHOTS) bank.snapshots.shift();
}

function carry(bank: Bank, gap: Gap): void {
  for (const h of bank.beam) propagate(h, gap);
  for (const family of bank.families) for (const h of family.beam) propagate(h, gap);
  carryOver(bank.leader.signatures, gap);
}

function giveBirth(bank: Bank, place: BirthPlace, index: number): void {
  const gap = waitingGap(bank.beam, place, index, bank.logScale, bank.leader.gained);
  bank.waiting.push(gap);
  enterGap(bank.leader, gap);
}

/** The family as it is now, whether it is carried or waits; null when it was never born, or has been dropped. */
export function familyOf(bank: Bank, kind: Cause, gap: number): Family | null {
  const carried = bank.families.find((f) => f.gap === gap && f.kind === kind);
  if (carried !== undefined) return carried;
  const waiting = bank.waiting.find((w) => w.index === gap);
  if (waiting === undefined || kind === 'lost count' || waiting.told.includes(kind)) return null;
  return recall(waiting, kind, bank.passages, bank.logScale, bank.scratch);
}

/** Adds hypotheses that a search has found to the family of a gap; `width` of them are kept open. */
export function joinFamily(bank: Bank, kind: Kind, gap: number, found: readonly Hypothesis[], width: number): void {
  const family = familyOf(bank, kind, gap);
  const beam = family === null ? [...found] : [...family.beam, ...found];
  const others = bank.families.filter((f) => f !== family);
  bank.families = [...others, { ...newFamily(kind, gap, pruned(beam, width)), openSizes: width }];
  const waiting = bank.waiting.find((w) => w.index === gap);
  if (waiting !== undefined && !waiting.told.includes(kind)) waiting.told = [...waiting.told, kind];
}

/** Drops what is too old or too light to matter, and divides all weights by their sum. */
function settle(bank: Bank, oldestGap: number): void {
  const nothing = logWeightOf(bank.beam);
  let heaviest = nothing;
  for (const { logWeight } of bank.families) heaviest = Math.max(heaviest, logWeight);
  const passage = bank.passages.at(-1);
  if (passage !== undefined) passage.heaviest = heaviest + bank.logScale;
  let sum = Math.exp(nothing - heaviest);
  bank.families = bank.families.filter((f) => {
    if (f.gap < oldestGap || f.logWeight < heaviest - FAMILY_FLOOR_NATS) return false;
    sum += Math.exp(f.logWeight - heaviest);
    return true;
  });
  dropGaps(bank, oldestGap);
  const total = heaviest + Math.log(sum);
  bank.logScale += total;
  for (const h of bank.beam) h.logWeight -= total;
  for (const family of bank.families) {
    family.logWeight -= total;
    for (const h of family.beam) h.logWeight -= total;
  }
}

function dropGaps(bank: Bank, oldestGap: number): void {
  const { waiting, passages, leader } = bank;
  while (waiting.length > 0 && waiting[0]!.index < oldestGap) {
    waiting.shift();
    leader.signatures.first++;
  }
  const from = waiting.length === 0 ? Infinity : waiting[0]!.index;
  while (passages.length > 0 && passages[0]!.seen.index < from) passages.shift();
}

function absoluteCopy(bank: Bank, h: Hypothesis): Hypothesis {
  const copy = copyOf(h);
  copy.logWeight += bank.logScale;
  return copy;
}

/** An event is believed: its hypotheses become the null, with the strongest dissenters kept beside them. */
export function collapse(bank: Bank, winners: readonly Hypothesis[], dissenters: readonly Hypothesis[]): void {
  const kept = pruned([...winners], bank.width - 4);
  const others = dissenters.length > 0 ? pruned([...dissenters], 4) : [];
  bank.beam = [...kept, ...others].sort((a, b) => b.logWeight - a.logWeight);
  bank.families = [];
  bank.waiting = [];
  bank.passages = [];
  bank.leader = newLeader(bank.beam[0]!);
  settle(bank, 0);
}
