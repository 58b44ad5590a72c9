/** A glitch with 0, 1, 2 or 3 exponentials: the posterior and evidence of each model over all candidate gaps. */

import { logSumExp } from '../math/logSumExp.ts';
import type { CandidateGap, EventFrame } from './eventFrame.ts';
import { type GapSystem, gapSystem, recoveryColumns } from './gapSystem.ts';
import { type EpochPosterior, explore, type GlitchPoint, pointsAt } from './glitchPosterior.ts';
import { type SizePrior, type SizeScale, sizeScales } from './sizePrior.ts';
import { type TimescaleLattice, type TimescaleRange, timescaleLattices } from './timescaleLattice.ts';
import type { WeighedLattice } from './timescaleMarginals.ts';

export const MOST_TERMS = 3;

/**
 * Prior probability of 0, 1, 2, 3 exponentials: 119 of 726 glitches have a measured recovery (Moragues et al. 2022,
 * arXiv:2210.09907), many more had too few arrivals for one; more than one is rare (no source).
 */
export const TERMS_PRIOR = [0.55, 0.3, 0.1, 0.05] as const;

/** Timescales looked for, days, where the arrivals can show them. */
const SHORTEST_DAYS = 0.3;
const LONGEST_DAYS = 3000;
/** A decay much quicker than the gap is over before it is seen: what it leaves is a step in phase, which noise imitates. */
const SHORTEST_OF_GAP = 1 / 3;
/** Of the spacing of the first arrivals after the event. */
const SHORTEST_OF_SPACING = 0.5;
/** A decay much slower than the arrivals after the event is a change of ν̇ like any other. */
const LONGEST_OF_SPAN = 3;

/** A gap so many nats behind the best one with fewer exponentials is not tried with more. */
const GAP_BEHIND = 12;
/** A model with 0, 1, 2 exponentials so many nats behind the best of those before it ends the search for more. */
const MODEL_BEHIND = [0, 1, 0.5, 0] as const;
/** Rungs of the size prior that hold less than e⁻⁹ where they are all looked at are left out of the rest. */
const RUNG_BEHIND = 9;
const CELLS_ASKED = 12;
/** Timescales that cannot come within so many nats of the best are not looked at closely. */
const HOPELESS = 60;
/** A model so many nats behind adds nothing to what is reported. */
const NEGLIGIBLE = 9;
/** Places of a posterior whose sizes are worked out, about. */
const MOST_POINTS = 1500;

export interface GlitchModel {
  readonly terms: number;
  /** ln p(data | model). */
  readonly logEvidence: number;
  /** The same with the model's prior probability. */
  readonly logWeight: number;
  /** All that count; masses include the model's prior. */
  readonly points: readonly GlitchPoint[];
  readonly timescales: readonly WeighedLattice[];
}

interface GapScan {
  readonly system: GapSystem;
  readonly lattices: readonly TimescaleLattice<Explored>[];
  readonly logEvidence: number;
}

interface Explored {
  readonly posterior: EpochPosterior;
  readonly scales: readonly SizeScale[];
}

/** The models worth weighing, fewest exponentials first. */
export function glitchModels(frame: EventFrame, prior: SizePrior, mostTerms: number): GlitchModel[] {
  let systems = frame.gaps.map((gap) => gapSystem(frame, gap));
  const scanned: GapScan[][] = [];
  const bestOf = new Map<GapSystem, number>();
  for (let terms = 0; terms <= mostTerms; terms++) {
    const scales = sizeScales(prior, terms);
    let known = Number.NEGATIVE_INFINITY;
    const scans = systems.map((system) => {
      const scan = scanGap(frame, system, terms, scales, known);
      known = Math.max(known, scan.logEvidence);
      return scan;
    });
    scanned.push(scans);
    const weights = scanned.map(logWeightOf);
    if (weights.at(-1)! < Math.max(...weights) - MODEL_BEHIND[terms]!) break;
    for (const { system, logEvidence } of scans)
      bestOf.set(system, Math.max(bestOf.get(system) ?? Number.NEGATIVE_INFINITY, logEvidence));
    const ahead = Math.max(...bestOf.values());
    if (terms > 0) systems = systems.filter((system) => bestOf.get(system)! > ahead - GAP_BEHIND);
  }
  const best = Math.max(...scanned.map(logWeightOf));
  return scanned.map((scans, terms) => {
    const logWeight = logWeightOf(scans, terms);
    const points = logWeight < best - NEGLIGIBLE ? [] : pointsOf(scans, Math.log(TERMS_PRIOR[terms]!));
    return { terms, logEvidence: logEvidenceOf(scans), logWeight, points, timescales: scans.flatMap(weighed) };
  });
}

/** ln p(data | a glitch with exponentials of these timescales). */
export function evidenceOf(frame: EventFrame, prior: SizePrior, timescalesDays: readonly number[]): number {
  const scales = sizeScales(prior, timescalesDays.length);
  return logSumExp(
    frame.gaps.map((gap) => {
      const system = gapSystem(frame, gap);
      return explore(frame, system, recoveryColumns(frame, system, timescalesDays), scales).logEvidence;
    }),
  );
}

function weighed({ lattices }: GapScan): WeighedLattice[] {
  return lattices.map(({ cells, cellSds }) => ({
    cells: cells.map(({ timescalesDays, logWeight, value }) => ({
      timescalesDays,
      logMass: value.posterior.logEvidence + logWeight,
    })),
    cellSds,
  }));
}

function logEvidenceOf(scans: readonly GapScan[]): number {
  return logSumExp(scans.map(({ logEvidence }) => logEvidence));
}

function logWeightOf(scans: readonly GapScan[], terms: number): number {
  return logEvidenceOf(scans) + Math.log(TERMS_PRIOR[terms]!);
}

/** `scales`: the rungs of the first pass; of these only the live ones go on. `known`: ln evidence found already. */
function scanGap(
  frame: EventFrame,
  system: GapSystem,
  terms: number,
  scales: readonly SizeScale[],
  known: number,
): GapScan {
  const coarse: EpochPosterior[] = [];
  let uphill: readonly SizeScale[] | null = null;
  let around = scales;
  let best = known;
  const lattices = timescaleLattices<Explored>(terms, timescaleRange(frame, system.gap), (timescales, stage) => {
    if (stage === 'uphill') uphill ??= rungsOfBest(coarse, scales);
    const rungs = stage === 'lattice' ? around : stage === 'uphill' ? uphill! : scales;
    const recovery = recoveryColumns(frame, system, timescales);
    const hopeless = stage === 'maximum' ? Number.NEGATIVE_INFINITY : best - HOPELESS;
    const posterior = explore(frame, system, recovery, rungs, hopeless);
    if (posterior.spots.length > 0) best = Math.max(best, posterior.logEvidence);
    if (stage === 'coarse') coarse.push(posterior);
    if (stage === 'maximum') {
      const near = [posterior, ...coarse];
      around = scales.filter((_, k) => near.some((there) => holds(there, k, posterior.logEvidence - RUNG_BEHIND)));
    }
    return { height: posterior.logEvidence, value: { posterior, scales: rungs } };
  });
  const cells = lattices.flatMap((lattice) => lattice.cells);
  const logEvidence = logSumExp(cells.map(({ value, logWeight }) => value.posterior.logEvidence + logWeight));
  return { system, lattices, logEvidence };
}

/** The rungs that count in one of the best posteriors, which may all be far below what lies between them. */
function rungsOfBest(posteriors: readonly EpochPosterior[], scales: readonly SizeScale[]): SizeScale[] {
  const best = posteriors.toSorted((a, b) => b.logEvidence - a.logEvidence).slice(0, CELLS_ASKED);
  return scales.filter((_, k) => best.some((there) => holds(there, k, there.logEvidence - RUNG_BEHIND)));
}

/** Whether rung `k` reaches a mass. */
function holds({ rungs, logEvidence }: EpochPosterior, k: number, logMass: number): boolean {
  return rungs[k]! + logEvidence > logMass;
}

/** The timescales that the arrivals can show. */
export function timescaleRange({ arrivals }: Pick<EventFrame, 'arrivals'>, gap: CandidateGap): TimescaleRange {
  const first = arrivals[gap.after]!.tDays;
  const span = arrivals.at(-1)!.tDays - first;
  const spacing = (arrivals[gap.after + 1]?.tDays ?? first) - first;
  const lowDays = Math.max(SHORTEST_DAYS, SHORTEST_OF_SPACING * spacing, SHORTEST_OF_GAP * gap.lengthDays);
  return { lowDays, highDays: Math.max(Math.min(LONGEST_DAYS, LONGEST_OF_SPAN * span), 4 * lowDays) };
}

/**
 * A few places stand for all: those that hold a share of their own, and of the others every so many, each for those it was
 * taken from (systematic resampling, Kitagawa 1996, J. Comput. Graph. Stat. 5, 1; without chance, so that it can be repeated).
 */
function pointsOf(scans: readonly GapScan[], logPrior: number): GlitchPoint[] {
  const total = logEvidenceOf(scans);
  const points: GlitchPoint[] = [];
  let passed = 0.5;
  for (const { value, logWeight } of scans.flatMap(({ lattices }) => lattices.flatMap(({ cells }) => cells))) {
    for (const spot of value.posterior.spots) {
      const count = MOST_POINTS * Math.exp(spot.logMass + logWeight - total);
      passed += Math.min(1, count);
      if (passed < 1) continue;
      passed -= 1;
      const logMass = total + Math.log(Math.max(1, count) / MOST_POINTS) + logPrior;
      points.push(...pointsAt(value.posterior, spot, value.scales, logMass));
    }
  }
  return points;
}
