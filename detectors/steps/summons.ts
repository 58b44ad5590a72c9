/** Which families are carried through the arrivals, and which may wait: those for which nothing speaks. */

import type { Bank } from './bank.ts';
import { logGoodOverOutlier, logWeightOf, type Observation } from './beam.ts';
import { KINDS, type Kind } from './births.ts';
import { YOUNG_ARRIVALS } from './family.ts';
import { followAnew, keepsLead } from './leader.ts';
import { count } from './signatures.ts';
import { kindsAbove, recall, signatureWeight, type WaitingGap } from './waiting.ts';

/**
 * Natural-log weight against the null from which a family is carried. Once all that is carried weighs `ALERT_NATS`, so are
 * the lighter ones that add to it, down to so much below all that or the null.
 */
const CARRIED_NATS = -3;
const ALERT_NATS = -1.5;
const BELOW_ON_ALERT_NATS = 8;
/** It waits again when it has become so much lighter than that. */
const RELEASE_NATS = 3;
/** Where the count is not sure, young families are carried for so many arrivals at least. */
const KEPT_ARRIVALS = 6;
/** Of so many latest arrivals this many set aside, or a spread (turns) of the prediction: the count is not sure. */
const LATEST = 6;
const UNSURE_SET_ASIDE = 2;
const UNSURE_SPREAD_TURNS = 0.1;

/** Natural-log weight against the null from which families are carried now. */
function level(bank: Bank): number {
  const nothing = logWeightOf(bank.beam);
  let something = 0;
  for (const { logWeight } of bank.families) something += Math.exp(logWeight - nothing);
  const log = Math.log(something);
  return log > ALERT_NATS ? Math.max(0, log) - BELOW_ON_ALERT_NATS : CARRIED_NATS;
}

/** After the null has taken the arrival in: calls the families that it, or doubt about the count, speaks for. */
export function summon(bank: Bank, seen: Observation, carryAll: boolean): void {
  const { leader, waiting } = bank;
  const h = bank.beam[0]!;
  if (waiting.length === 0) {
    leader.story = h.story;
    return;
  }
  if (!keepsLead(leader, h, seen)) {
    const strangers = followAnew(leader, h, waiting, bank.passages);
    for (const gap of waiting) gap.ceiling = Infinity;
    for (let g = 0; g < strangers; g++) callAll(bank, waiting[g]!, 0);
  }
  if (carryAll) {
    if (waiting.at(-1)!.index === seen.index) callAll(bank, waiting.at(-1)!, Infinity);
    return;
  }
  if (!h.story!.used) askOfOneSetAside(bank, seen);
  if (isUnsure(bank, seen)) callYoung(bank, seen.index);
  let asked: number;
  do {
    asked = level(bank);
    waiting.forEach((gap, g) => {
      for (const kind of kindsAbove(gap, leader.signatures, g, asked, leader.gained)) call(bank, gap, kind, 0);
    });
  } while (level(bank) < asked);
}

/** What would the families say if the arrival that the null set aside were good? */
function askOfOneSetAside(bank: Bank, seen: Observation): void {
  const { leader, waiting } = bank;
  const variance = leader.outlook.variance + seen.variance;
  const offset = seen.deviation - leader.outlook.deviation;
  const innovation = offset - Math.round(offset);
  const taken = logGoodOverOutlier(innovation, variance);
  const asked = level(bank);
  count(leader.signatures, innovation, variance);
  waiting.forEach((gap, g) => {
    if (gap.told.length === KINDS.length) return;
    for (const kind of KINDS)
      if (!gap.told.includes(kind) && signatureWeight(gap, kind, leader.signatures, g) + taken > asked)
        call(bank, gap, kind, 0);
  });
  count(leader.signatures, innovation, variance, -1);
}

function isUnsure({ beam, leader }: Bank, seen: Observation): boolean {
  if (leader.outlook.variance + seen.variance > UNSURE_SPREAD_TURNS ** 2) return true;
  let setAside = 0;
  for (let s = beam[0]!.story, n = 0; s !== null && n < LATEST; s = s.before, n++) {
    if (s.slipped) return true;
    if (!s.used) setAside++;
  }
  return setAside >= UNSURE_SET_ASIDE;
}

function callYoung(bank: Bank, index: number): void {
  for (const gap of bank.waiting) if (index - gap.index < YOUNG_ARRIVALS) callAll(bank, gap, index + KEPT_ARRIVALS);
}

function callAll(bank: Bank, gap: WaitingGap, keptUntil: number): void {
  for (const kind of KINDS) call(bank, gap, kind, keptUntil);
}

function call(bank: Bank, gap: WaitingGap, kind: Kind, keptUntil: number): void {
  if (gap.told.includes(kind)) return;
  gap.told = [...gap.told, kind];
  const family = recall(gap, kind, bank.passages, bank.logScale, bank.scratch);
  if (family === null) return;
  family.keptUntil = keptUntil;
  bank.families.push(family);
}

/** Before the next arrival: families that have become light wait again. */
export function release(bank: Bank, index: number): void {
  if (bank.families.length === 0) return;
  const nothing = logWeightOf(bank.beam);
  const asked = level(bank);
  bank.families = bank.families.filter((family) => {
    if (family.openSizes > 0 || family.keptUntil >= index || family.logWeight - nothing > asked - RELEASE_NATS)
      return true;
    const position = bank.waiting.findIndex((gap) => gap.index === family.gap);
    const gap = bank.waiting[position]!;
    if (disagree(gap)) return true;
    const weight = signatureWeight(gap, family.kind, bank.leader.signatures, position);
    if (weight > asked) return true;
    gap.told = gap.told.filter((kind) => kind !== family.kind);
    gap.ceiling = Math.max(gap.ceiling + bank.leader.gained - gap.gainedThen, weight);
    gap.gainedThen = bank.leader.gained;
    return false;
  });
}

/** Whether parents differ in the events they believe: then their children are witnesses for or against them. */
function disagree({ parents }: WaitingGap): boolean {
  return parents.some(({ tracks }) => tracks.join() !== parents[0]!.tracks.join());
}
