/**
 * Sizes that regular scheduling cannot tell apart: arrivals whole sidereal days apart see Δν and Δν + N/86164.0905 s
 * alike (Dunn et al. 2021, MNRAS 504, 3399). Each surviving size is fitted in full and weighed by its evidence.
 */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { logSumExp } from '../math/logSumExp.ts';
import { fitGlitch, type GlitchFit, type GlitchFitInput, logEvidenceAt } from '../recovery/glitchFit.ts';

export interface Alias {
  readonly deltaNuHz: number;
  readonly probability: number;
}

/** Seconds; IERS Conventions 2010, from the Earth rotation rate at present epochs. */
const SIDEREAL_DAY_S = 86_164.0905;
const SECONDS_PER_DAY = 86_400;
/** Whole turns a sidereal day tried, and the physical range of Δν/ν. */
const ORDERS = [-3, -2, -1, 1, 2, 3, 4, 5, 6];
const LOWEST = -1e-5;
const HIGHEST = 1e-4;
/** An order is worth a fit while the arrivals lie this close (turns, rms) to whole turns of it. */
const CLOSE_TURNS = 0.2;
const LEAST_PROBABILITY = 1e-3;
/** By a first look with the recovery of the counts as given, a size less probable than this is not fitted in full. */
const LEAST_AT_SIGHT = 3e-3;

export interface SizedGlitch {
  /** Of the most probable size. */
  readonly fit: GlitchFit;
  /** The counts that go with it. */
  readonly counted: readonly CountedArrival[];
  /** All surviving sizes, most probable first; empty when there is just one. */
  readonly aliases: readonly Alias[];
}

/**
 * `fit`: of the input with its counts as given. `bestGap`: index of the first arrival after the most probable gap; the other
 * counts begin there.
 */
export function aliasesOf(input: GlitchFitInput, fit: GlitchFit, bestGap: number): SizedGlitch {
  const candidates = [{ fit, counted: input.arrivals }];
  for (const counted of otherCounts(input, fit, bestGap))
    candidates.push({ fit: fitGlitch(counted), counted: counted.arrivals });
  const probabilities = shares(candidates.map(({ fit: { logEvidence } }) => logEvidence));
  const ranked = candidates
    .map((candidate, i) => ({ ...candidate, probability: probabilities[i]! }))
    .sort((a, b) => b.probability - a.probability);
  const alive = ranked.filter((r) => r.probability > LEAST_PROBABILITY);
  return {
    fit: ranked[0]!.fit,
    counted: ranked[0]!.counted,
    aliases:
      alive.length < 2 ? [] : alive.map(({ fit, probability }) => ({ deltaNuHz: fit.deltaNuHz.mean, probability })),
  };
}

/** The other counts worth a fit in full. */
function otherCounts(input: GlitchFitInput, fit: GlitchFit, bestGap: number): GlitchFitInput[] {
  const possible: GlitchFitInput[] = [];
  for (const order of ORDERS) {
    const sized = fit.deltaNuHz.mean + order / SIDEREAL_DAY_S;
    if (sized < LOWEST * input.frequencyHz || sized > HIGHEST * input.frequencyHz) continue;
    const arrivals = recounted(input, order, bestGap);
    if (arrivals === null) continue;
    possible.push({ ...input, firstGapBeforeIndex: bestGap, lastGapBeforeIndex: bestGap, arrivals });
  }
  if (possible.length === 0) return [];
  const atSight = shares([input, ...possible].map((one) => logEvidenceAt(one, fit.bestTimescalesDays)));
  return possible.filter((_, i) => atSight[i + 1]! > LEAST_AT_SIGHT);
}

function shares(logEvidence: readonly number[]): number[] {
  const total = logSumExp(logEvidence);
  return logEvidence.map((e) => Math.exp(e - total));
}

/** The counts after the event for `order` more turns a sidereal day; null when the arrivals rule that out at sight. */
function recounted(input: GlitchFitInput, order: number, after: number): CountedArrival[] | null {
  const turnsPerDay = (order * SECONDS_PER_DAY) / SIDEREAL_DAY_S;
  const reference = input.arrivals[after]!.tDays;
  let sum = 0;
  let count = 0;
  const shifted = input.arrivals.map((arrival, i) => {
    if (i < after) return arrival;
    const turns = turnsPerDay * (arrival.tDays - reference);
    if (arrival.used) {
      sum += (turns - Math.round(turns)) ** 2;
      count++;
    }
    return { ...arrival, deviationTurns: arrival.deviationTurns - Math.round(turns) };
  });
  return count > 0 && Math.sqrt(sum / count) < CLOSE_TURNS ? shifted : null;
}
