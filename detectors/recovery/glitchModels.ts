/** A glitch with 0, 1, 2 or 3 exponentials: the posterior and evidence of each model over all candidate gaps. */

import { logSumExp } from '../math/logSumExp.ts';
import type { CandidateGap, EventFrame } from './eventFrame.ts';
import { type GapSystem, gapSystem, recoveryColumns } from './gapSystem.ts';
import { type EpochPosterior, explore, type GlitchPoint, pointsAt } from './glitchPosterior.ts';
import { type SizePrior, type SizeScale, sizeScales } from './sizePrior.ts';
import { type TimescaleCell, type TimescaleRange, timescaleLattice } from './timescaleLattice.ts';

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
/**
 * Rungs of the size prior that hold less than e⁻⁹ in the best cells of a first pass are left out of the rest; of the
 * model with one exponential less, e⁻²⁰.
 */
const RUNG_BEHIND = 9;
const RUNG_FAR_BEHIND = 20;
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
}

interface GapScan {
  readonly system: GapSystem;
  readonly cells: readonly TimescaleCell<Explored>[];
  readonly logEvidence: number;
  /** Rungs that a model with one more exponential starts from. */
  readonly rungs: readonly SizeScale[];
}

interface Explored {
  readonly posterior: EpochPosterior;
  readonly scales: readonly SizeScale[];
}

/** The models worth weighing, fewest exponentials first. */
export function glitchModels(frame: EventFrame, prior: SizePrior, mostTerms: number): GlitchModel[] {
  let systems = frame.gaps.map((gap) => gapSystem(frame, gap));
  let rungs = new Map<GapSystem, readonly SizeScale[]>();
  const scanned: GapScan[][] = [];
  const bestOf = new Map<GapSystem, number>();
  for (let terms = 0; terms <= mostTerms; terms++) {
    const all = sizeScales(prior, terms);
    let known = Number.NEGATIVE_INFINITY;
    const scans = systems.map((system) => {
      const scan = scanGap(frame, system, terms, (terms > 1 && rungs.get(system)) || all, known);
      known = Math.max(known, scan.logEvidence);
      return scan;
    });
    rungs = new Map(scans.map((scan) => [scan.system, scan.rungs]));
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
    return { terms, logEvidence: logEvidenceOf(scans), logWeight, points };
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
  const first: EpochPosterior[] = [];
  let live: readonly SizeScale[] | null = null;
  let atMaximum: readonly SizeScale[] | null = null;
  let best = known;
  const cells = timescaleLattice<Explored>(terms, timescaleRange(frame, system.gap), (timescales, stage) => {
    const recovery = recoveryColumns(frame, system, timescales);
    const looked = (rungs: readonly SizeScale[]) => explore(frame, system, recovery, rungs, best - HOPELESS);
    if (stage === 'uphill') live ??= liveRungs(first, scales, RUNG_BEHIND);
    if (stage === 'lattice') atMaximum ??= liveRungs([looked(scales)], scales, RUNG_BEHIND);
    const rungs = atMaximum ?? live ?? scales;
    const posterior = looked(rungs);
    if (posterior.spots.length > 0) best = Math.max(best, posterior.logEvidence);
    if (stage === 'coarse') first.push(posterior);
    return { height: posterior.logEvidence, value: { posterior, scales: rungs } };
  });
  const peak = highest(cells).value;
  return {
    system,
    cells,
    logEvidence: logSumExp(cells.map(({ value, logWeight }) => value.posterior.logEvidence + logWeight)),
    rungs: liveRungs([peak.posterior], peak.scales, RUNG_FAR_BEHIND),
  };
}

function highest(cells: readonly TimescaleCell<Explored>[]): TimescaleCell<Explored> {
  return cells.reduce((a, b) => (b.value.posterior.logEvidence > a.value.posterior.logEvidence ? b : a));
}

/** The rungs that count in one of the best posteriors. */
function liveRungs(posteriors: readonly EpochPosterior[], scales: readonly SizeScale[], behind: number): SizeScale[] {
  const best = posteriors.toSorted((a, b) => b.logEvidence - a.logEvidence).slice(0, CELLS_ASKED);
  return scales.filter((_, k) => best.some(({ rungs }) => rungs[k]! > -behind));
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
  for (const { value, logWeight } of scans.flatMap(({ cells }) => cells)) {
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
