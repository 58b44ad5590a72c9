/**
 * The bank: the null beam (nothing new has happened) and, for each recent gap between arrivals and each explanation, a
 * beam of its own, so that a small step is not pruned before its evidence has grown.
 */

import type { NoiseModel } from '../report.ts';
import { logWeightOf, type Observation, observe, observeFirmly, pruned } from './beam.ts';
import { type BirthPlace, born, KINDS, type Kind } from './births.ts';
import {
  copyOf,
  type Decay,
  type Gap,
  gapOf,
  type Hypothesis,
  type Prediction,
  propagate,
  withState,
  zeros,
} from './hypothesis.ts';

/** All hypotheses that say: this kind of thing happened in the gap before arrival `gap`. */
export interface Family {
  readonly kind: Kind;
  /** Index of the first arrival after the gap. */
  readonly gap: number;
  beam: Hypothesis[];
  /** Natural log of the weight of all of them. */
  logWeight: number;
}

/** The heaviest null hypothesis after an arrival, kept to search back from. */
export interface Snapshot {
  readonly index: number;
  readonly tDays: number;
  readonly hypothesis: Hypothesis;
}

export interface Bank {
  noise: NoiseModel;
  beam: Hypothesis[];
  families: Family[];
  /** Natural log that all weights have been divided by so far. */
  logScale: number;
  snapshots: Snapshot[];
  /** Recoveries from glitches that are believed. */
  readonly decays: readonly Decay[];
  readonly scratch: Prediction;
}

const NULL_BEAM = 16;
/** A large glitch wraps within its first gaps: many counts must stay open. */
const YOUNG_BEAM: Readonly<Record<Kind, number>> = {
  glitch: 20,
  'spin-down-rate change': 4,
  'clock step': 6,
  'dispersion step': 4,
};
const OLD_BEAM: Readonly<Record<Kind, number>> = {
  glitch: 3,
  'spin-down-rate change': 2,
  'clock step': 2,
  'dispersion step': 2,
};
/** A gap is young for this many arrivals: its counts may still branch. */
const YOUNG_ARRIVALS = 5;
/** Null hypotheses within this of the heaviest become parents. */
const PARENT_NATS = 5;
const PARENTS = 3;
/** A family this far below everything else is not carried on. */
const FAMILY_FLOOR_NATS = 18;
const SNAPSHOTS = 64;

/** A bank whose hypotheses have seen the arrivals up to the one of `at`. */
export function newBank(
  noise: NoiseModel,
  beam: Hypothesis[],
  at: { readonly index: number; readonly tDays: number },
  decays: readonly Decay[],
): Bank {
  const scratch = { deviation: 0, variance: 0, gain: zeros(beam[0]!.mean.length), plain: true };
  const snapshots = [{ ...at, hypothesis: copyOf(beam[0]!) }];
  return { noise, beam, families: [], logScale: 0, snapshots, decays, scratch };
}

/** One more nuisance in every hypothesis: a receiver or a band seen for the first time. */
export function addState(bank: Bank, variance: number): Bank {
  const grow = (h: Hypothesis) => withState(h, variance);
  const beam = bank.beam.map(grow);
  return {
    ...bank,
    beam,
    families: bank.families.map((f) => ({ ...f, beam: f.beam.map(grow) })),
    snapshots: bank.snapshots.map((s) => ({ ...s, hypothesis: grow(s.hypothesis) })),
    scratch: { deviation: 0, variance: 0, gain: zeros(beam[0]!.mean.length), plain: true },
  };
}

/** What one step of the bank is given. `place` is null while nothing may be born (not yet locked, rebuilding). */
export interface BankStep {
  readonly seen: Observation;
  readonly tDays: number;
  readonly gapDays: number;
  readonly place: BirthPlace | null;
  readonly oldestGap: number;
}

export function stepBank(bank: Bank, step: BankStep): void {
  const gap = gapOf(step.gapDays, bank.noise, bank.decays);
  carry(bank, gap);
  if (step.place !== null) giveBirth(bank, step.place, step.seen.index);
  bank.beam = observe(bank.beam, step.seen, NULL_BEAM, bank.scratch);
  const last = { page: null };
  for (const family of bank.families) {
    const age = step.seen.index - family.gap;
    if (age < YOUNG_ARRIVALS) family.beam = observe(family.beam, step.seen, YOUNG_BEAM[family.kind], bank.scratch);
    else observeFirmly(family.beam, step.seen, bank.scratch, last);
    if (age === YOUNG_ARRIVALS) family.beam = pruned(family.beam, OLD_BEAM[family.kind]);
  }
  settle(bank, step.oldestGap);
  bank.snapshots.push({ index: step.seen.index, tDays: step.tDays, hypothesis: absoluteCopy(bank, bank.beam[0]!) });
  if (bank.snapshots.length > SNAPSHOTS) bank.snapshots.shift();
}

function carry(bank: Bank, gap: Gap): void {
  for (const h of bank.beam) propagate(h, gap);
  for (const family of bank.families) for (const h of family.beam) propagate(h, gap);
}

function giveBirth(bank: Bank, place: BirthPlace, index: number): void {
  const best = bank.beam[0]!.logWeight;
  const parents = bank.beam.slice(0, PARENTS).filter((h) => h.logWeight > best - PARENT_NATS);
  for (const kind of KINDS) {
    const beam = parents.flatMap((parent) => born(kind, parent, place));
    if (beam.length > 0) bank.families.push({ kind, gap: index, beam, logWeight: logWeightOf(beam) });
  }
}

/** Drops what is too old or too light to matter, and divides all weights by their sum. */
function settle(bank: Bank, oldestGap: number): void {
  const nothing = logWeightOf(bank.beam);
  let heaviest = nothing;
  for (const family of bank.families) {
    family.logWeight = logWeightOf(family.beam);
    heaviest = Math.max(heaviest, family.logWeight);
  }
  let sum = Math.exp(nothing - heaviest);
  bank.families = bank.families.filter((f) => {
    if (f.gap < oldestGap || f.logWeight < heaviest - FAMILY_FLOOR_NATS) return false;
    sum += Math.exp(f.logWeight - heaviest);
    return true;
  });
  const total = heaviest + Math.log(sum);
  bank.logScale += total;
  for (const h of bank.beam) h.logWeight -= total;
  for (const family of bank.families) {
    family.logWeight -= total;
    for (const h of family.beam) h.logWeight -= total;
  }
}

function absoluteCopy(bank: Bank, h: Hypothesis): Hypothesis {
  const copy = copyOf(h);
  copy.logWeight += bank.logScale;
  return copy;
}

/** An event is believed: its hypotheses become the null, with the strongest dissenters kept beside them. */
export function collapse(bank: Bank, winners: readonly Hypothesis[], dissenters: readonly Hypothesis[]): void {
  const kept = pruned([...winners], NULL_BEAM - 4);
  const others = dissenters.length > 0 ? pruned([...dissenters], 4) : [];
  bank.beam = [...kept, ...others].sort((a, b) => b.logWeight - a.logWeight);
  bank.families = [];
  settle(bank, 0);
}
