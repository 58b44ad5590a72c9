/** Reads the bank: how much weight each explanation carries, and in which gaps it lies. */

import { logAddExp } from '../math/logSumExp.ts';
import type { Bank } from './bank.ts';
import { logWeightOf } from './beam.ts';
import type { Kind } from './births.ts';
import type { Hypothesis } from './hypothesis.ts';
import type { GapSpread } from './track.ts';

export interface Evidence {
  /** Natural log of the weight of "nothing new". */
  readonly nothing: number;
  /** Natural log of the weight of each kind, over all gaps. */
  readonly byKind: ReadonlyMap<Kind, number>;
  /** The heaviest kind; null when no family is alive. */
  readonly strongest: Kind | null;
  /** Natural log of the weight of everything new. */
  readonly something: number;
}

export function weigh(bank: Bank): Evidence {
  const byKind = new Map<Kind, number>();
  let something = -Infinity;
  for (const family of bank.families) {
    byKind.set(family.kind, logAddExp(byKind.get(family.kind) ?? -Infinity, family.logWeight));
    something = logAddExp(something, family.logWeight);
  }
  let strongest: Kind | null = null;
  for (const [kind, weight] of byKind) if (strongest === null || weight > byKind.get(strongest)!) strongest = kind;
  return { nothing: logWeightOf(bank.beam), byKind, strongest, something };
}

/** A confirmed event's explanation must hold at least this share against what is not of the same nature. */
export const EXPLANATION_SHARE = 0.99;
/**
 * Against the other change of the rotation. The start of a ramp and that of a parabola differ by little, and a candidate is
 * vetted either way: to be sure which it is would cost half as many arrivals again.
 */
export const SHARE_OF_ROTATION = 0.7;
const ROTATION: readonly Kind[] = ['glitch', 'spin-down-rate change'];

/** One explanation has won. */
export function isExplained({ byKind }: Evidence, kind: Kind): boolean {
  const own = byKind.get(kind)!;
  if (!ROTATION.includes(kind)) return own >= Math.log(EXPLANATION_SHARE);
  const rotation = ROTATION.reduce((sum, other) => logAddExp(sum, byKind.get(other) ?? -Infinity), -Infinity);
  return rotation >= Math.log(EXPLANATION_SHARE) && own - rotation >= Math.log(SHARE_OF_ROTATION);
}

/** The gaps that hold 95 % of the weight of a kind, and how many share it. */
export function spreadOf(bank: Bank, kind: Kind): GapSpread {
  const gaps = bank.families
    .filter((f) => f.kind === kind)
    .map((f) => ({ gap: f.gap, weight: Math.exp(f.logWeight) }))
    .sort((a, b) => b.weight - a.weight);
  const total = gaps.reduce((sum, g) => sum + g.weight, 0);
  const bestGap = gaps[0]!.gap;
  let firstGap = bestGap;
  let lastGap = bestGap;
  let held = 0;
  for (const { gap, weight } of gaps) {
    if (held > 0.95 * total) break;
    held += weight;
    firstGap = Math.min(firstGap, gap);
    lastGap = Math.max(lastGap, gap);
  }
  return { bestGap, firstGap, lastGap, logPlaces: Math.log(total / gaps[0]!.weight) };
}

/** Probability of every explanation; of "nothing new" by what it must believe of the arrivals since `gap`. */
export function explanationsOf(
  bank: Bank,
  evidence: Evidence,
  gap: number,
  sessionOf: (index: number) => number,
): Record<string, number> {
  const masses: Record<string, number> = {};
  for (const [kind, weight] of evidence.byKind) masses[kind] = Math.exp(weight);
  for (const h of bank.beam) {
    const name = withoutEvent(h, gap, sessionOf);
    masses[name] = (masses[name] ?? 0) + Math.exp(h.logWeight);
  }
  const total = Object.values(masses).reduce((sum, mass) => sum + mass, 0);
  for (const name of Object.keys(masses)) masses[name] = total > 0 ? masses[name]! / total : 0;
  return masses;
}

/** What a null hypothesis makes of the arrivals from `gap` on. */
function withoutEvent(h: Hypothesis, gap: number, sessionOf: (index: number) => number): string {
  const sessions = new Set<number>();
  let setAside = 0;
  let slipped = false;
  for (let s = h.story; s !== null && s.index >= gap; s = s.before) {
    if (!s.used) {
      setAside++;
      sessions.add(sessionOf(s.index));
    }
    slipped = slipped || s.slipped;
  }
  if (slipped) return 'lost count';
  if (setAside === 0) return 'wandering';
  return setAside > 1 && sessions.size === 1 ? 'bad session' : 'bad arrival';
}

/** Sessions from `gap` on in which the hypothesis used at least one arrival. */
export function sessionsUsed(h: Hypothesis, gap: number, sessionOf: (index: number) => number): number {
  const sessions = new Set<number>();
  for (let s = h.story; s !== null && s.index >= gap; s = s.before) if (s.used) sessions.add(sessionOf(s.index));
  return sessions.size;
}
