/**
 * A beam: a few hypotheses of one kind that keep their own count. An arrival may lie a whole number of turns off, or be
 * an outlier; each hypothesis branches into what is still credible, and the beam is pruned by weight.
 */

import { logAddExp } from '../math/logSumExp.ts';
import { absorb, copyOf, type Hypothesis, type Prediction, predict, type Sight, type Story } from './hypothesis.ts';

/** One arrival as every hypothesis sees it. */
export interface Observation {
  readonly index: number;
  /** Wrapped deviation in turns, late positive. */
  readonly deviation: number;
  /** Measurement variance after scale and floor, turns². */
  readonly variance: number;
  readonly sight: Sight;
  /** The model's pulse number minus the one the arrival came with; null when it came with none. */
  readonly turnsToNumber: number | null;
  /** In the same session (same site, minutes apart) as the arrival before. */
  readonly sameSession: boolean;
}

/** Share of arrivals that are bad in ways no error bar covers (common practice, no source). */
export const OUTLIER_SHARE = 0.02;
/** A bad session is paid for once: the next arrival of a session that began badly is likely bad too. */
export const OUTLIER_SHARE_AFTER_OUTLIER = 0.8;
/** A turn, or the outlier branch, is followed while it is within e^-9 of the best branch. */
const BRANCH_NATS = 9;
/** Above this spread (turns) of the prediction more than the nearest turn is looked at. */
const AMBIGUOUS_SPREAD = 0.1;
/** A pulse number in a file is wrong, or begins a new numbering, this often (common practice, no source). */
const LOG_WRONG_NUMBER = Math.log(1e-4);
const LOG_TWO_PI = Math.log(2 * Math.PI);
const LOG_OUTLIER = Math.log(OUTLIER_SHARE);
const LOG_GOOD = Math.log(1 - OUTLIER_SHARE);
const LOG_OUTLIER_AFTER_OUTLIER = Math.log(OUTLIER_SHARE_AFTER_OUTLIER);
const LOG_GOOD_AFTER_OUTLIER = Math.log(1 - OUTLIER_SHARE_AFTER_OUTLIER);

/** A branch not yet followed: weights are compared before any state is copied. */
interface Branch {
  readonly parent: Hypothesis;
  readonly logWeight: number;
  readonly used: boolean;
  readonly turns: number;
  readonly slipped: boolean;
}

/**
 * Takes one arrival into every hypothesis of the beam, already carried to its time; returns the beam anew, at most
 * `keep` long, heaviest first.
 */
export function observe(
  beam: readonly Hypothesis[],
  seen: Observation,
  keep: number,
  scratch: Prediction,
): Hypothesis[] {
  const branches: Branch[] = [];
  for (const h of beam) branch(h, seen, scratch, branches);
  if (branches.length > 1) branches.sort(byWeight);
  const floor = branches[0]!.logWeight - 2 * BRANCH_NATS;
  let taken = 0;
  while (taken < branches.length && taken < 2 * keep && branches[taken]!.logWeight >= floor) taken++;
  const next: Hypothesis[] = [];
  for (let i = 0; i < taken; i++) {
    const b = branches[i]!;
    // The last branch of a parent may have the parent itself.
    next.push(follow(b, branchesAgain(branches, i, taken) ? copyOf(b.parent) : b.parent, seen, scratch));
  }
  return next.length <= 1 ? next : pruned(next, keep);
}

function branchesAgain(branches: readonly Branch[], from: number, until: number): boolean {
  const { parent } = branches[from]!;
  for (let i = from + 1; i < until; i++) if (branches[i]!.parent === parent) return true;
  return false;
}

function branch(h: Hypothesis, seen: Observation, scratch: Prediction, into: Branch[]): void {
  predict(h, seen.sight, scratch);
  const spread2 = scratch.variance + seen.variance;
  const offset = seen.deviation - scratch.deviation;
  const nearest = -Math.round(offset);
  const afterOutlier = seen.sameSession && h.lastSetAside;
  const level = (afterOutlier ? LOG_GOOD_AFTER_OUTLIER : LOG_GOOD) - 0.5 * (LOG_TWO_PI + Math.log(spread2));
  const logOutlier = afterOutlier ? LOG_OUTLIER_AFTER_OUTLIER : LOG_OUTLIER;
  const numbered = numberedTurns(h, seen);
  const reach = spread2 < AMBIGUOUS_SPREAD * AMBIGUOUS_SPREAD ? 0 : Math.min(8, Math.ceil(4 * Math.sqrt(spread2)));
  const atNearest = logDensity(level, offset, spread2, nearest, numbered);
  const atNumbered = numbered === null ? -Infinity : logDensity(level, offset, spread2, numbered, numbered);
  const floor = Math.max(atNearest, atNumbered, logOutlier) - BRANCH_NATS;
  const { logWeight } = h;
  if (logOutlier > floor)
    into.push({ parent: h, logWeight: logWeight + logOutlier, used: false, turns: nearest, slipped: false });
  for (let turns = nearest - reach; turns <= nearest + reach; turns++) {
    const density = reach === 0 ? atNearest : logDensity(level, offset, spread2, turns, numbered);
    if (density > floor)
      into.push({ parent: h, logWeight: logWeight + density, used: true, turns, slipped: turns !== nearest });
  }
  if (numbered !== null && Math.abs(numbered - nearest) > reach && atNumbered > floor)
    into.push({ parent: h, logWeight: logWeight + atNumbered, used: true, turns: numbered, slipped: true });
}

/** Natural log of the density of an arrival at this count, a wrong pulse number paid for. */
function logDensity(level: number, offset: number, spread2: number, turns: number, numbered: number | null): number {
  const wrongNumber = numbered === null || turns === numbered ? 0 : LOG_WRONG_NUMBER;
  return level - (0.5 * (offset + turns) ** 2) / spread2 + wrongNumber;
}

/** Natural log of how much likelier an arrival with this innovation is when taken as good than as an outlier. */
export function logGoodOverOutlier(innovation: number, variance: number): number {
  return LOG_GOOD - LOG_OUTLIER - 0.5 * (LOG_TWO_PI + Math.log(variance) + (innovation * innovation) / variance);
}

/** The whole turns that the arrival's own pulse number asks for; null when it has none, or is the first that has one. */
function numberedTurns(h: Hypothesis, seen: Observation): number | null {
  return seen.turnsToNumber === null || h.numbering === null ? null : seen.turnsToNumber + h.numbering;
}

/** Arrivals that are used tie the count to the numbers of the files. */
function tie(h: Hypothesis, seen: Observation, turns: number): void {
  if (seen.turnsToNumber !== null) h.numbering = turns - seen.turnsToNumber;
}

/** Turns `child`, a copy of the branch's parent or the parent itself where it has no other branch, into the branch. */
function follow(b: Branch, child: Hypothesis, seen: Observation, scratch: Prediction): Hypothesis {
  const { used, turns, slipped } = b;
  if (used) {
    predict(child, seen.sight, scratch);
    absorb(child, scratch, seen.deviation + turns - scratch.deviation, scratch.variance + seen.variance);
    tie(child, seen, turns);
  }
  child.logWeight = b.logWeight;
  child.story = { index: seen.index, turns, used, slipped, before: b.parent.story };
  child.lastSetAside = !used;
  return child;
}

/**
 * The same without branching, in place: each hypothesis takes its likeliest branch and the weight of all of them. For
 * beams whose counts are settled; the cost is one filter step each.
 */
export function observeFirmly(
  beam: readonly Hypothesis[],
  seen: Observation,
  scratch: Prediction,
  last: LastPage,
): void {
  for (const h of beam) {
    predict(h, seen.sight, scratch);
    const spread2 = scratch.variance + seen.variance;
    const offset = seen.deviation - scratch.deviation;
    const turns = firmTurns(h, seen, offset, spread2);
    const innovation = offset + turns;
    const outlierShare = seen.sameSession && h.lastSetAside ? OUTLIER_SHARE_AFTER_OUTLIER : OUTLIER_SHARE;
    const good =
      ((1 - outlierShare) * Math.exp((-0.5 * innovation * innovation) / spread2)) / Math.sqrt(2 * Math.PI * spread2);
    h.logWeight += Math.log(good + outlierShare);
    h.lastSetAside = good < outlierShare;
    if (!h.lastSetAside) {
      absorb(h, scratch, innovation, spread2);
      tie(h, seen, turns);
    }
    h.story = continued(h.story, seen.index, turns, !h.lastSetAside, last);
  }
}

/** The nearest turn, or the numbered one where that is the likelier. */
function firmTurns(h: Hypothesis, seen: Observation, offset: number, spread2: number): number {
  const nearest = -Math.round(offset);
  const numbered = numberedTurns(h, seen);
  if (numbered === null) return nearest;
  const gain = ((offset + numbered) ** 2 - (offset + nearest) ** 2) / (2 * spread2);
  return gain < -LOG_WRONG_NUMBER ? numbered : nearest;
}

/** The page of a story that was written last: hypotheses of one origin mostly decide alike, and share it. */
export interface LastPage {
  page: Story | null;
}

function continued(before: Story | null, index: number, turns: number, used: boolean, last: LastPage): Story {
  const { page } = last;
  if (page !== null && page.before === before && page.index === index && page.turns === turns && page.used === used)
    return page;
  last.page = { index, turns, used, slipped: false, before };
  return last.page;
}

/** Heaviest first; near-equal states merged; what cannot matter dropped. */
export function pruned(beam: Hypothesis[], keep: number): Hypothesis[] {
  beam.sort(byWeight);
  const floor = beam[0]!.logWeight - 2 * BRANCH_NATS;
  const kept: Hypothesis[] = [];
  for (const h of beam) {
    if (h.logWeight < floor) break;
    const twin = twinOf(h, kept);
    if (twin !== null) twin.logWeight = logAddExp(twin.logWeight, h.logWeight);
    else if (kept.length < keep) kept.push(h);
  }
  return kept;
}

function twinOf(h: Hypothesis, kept: readonly Hypothesis[]): Hypothesis | null {
  for (const other of kept) if (alike(other, h)) return other;
  return null;
}

function byWeight(a: { readonly logWeight: number }, b: { readonly logWeight: number }): number {
  return b.logWeight - a.logWeight;
}

/** The same events, and states that no further arrival will tell apart: whole turns between them are seen by none. */
function alike(a: Hypothesis, b: Hypothesis): boolean {
  if (a.lastSetAside !== b.lastSetAside || a.tracks.length !== b.tracks.length) return false;
  for (let i = 0; i < a.tracks.length; i++) if (a.tracks[i] !== b.tracks[i]) return false;
  const size = a.mean.length;
  for (let i = 0; i < size; i++) {
    const va = a.cov[i * size + i]!;
    const vb = b.cov[i * size + i]!;
    if (va > 1.2 * vb || vb > 1.2 * va) return false;
    const apart = a.mean[i]! - b.mean[i]!;
    const turns = i === 0 && a.numbering === null && b.numbering === null ? Math.round(apart) : 0;
    if ((apart - turns) ** 2 > 0.01 * Math.min(va, vb)) return false;
  }
  return true;
}

export function logWeightOf(beam: readonly Hypothesis[]): number {
  let highest = -Infinity;
  for (const h of beam) if (h.logWeight > highest) highest = h.logWeight;
  if (highest === -Infinity) return highest;
  let sum = 0;
  for (const h of beam) sum += Math.exp(h.logWeight - highest);
  return highest + Math.log(sum);
}
