/** What a glitch must pass to be confirmed (`steps/decide.ts`), as functions of a draw of the noise and of the size. */

import { logNoisePrior } from '../filter/noiseLearning.ts';
import { logAddExp } from '../math/logSumExp.ts';
import { median } from '../math/median.ts';
import type { NoiseModel } from '../report.ts';
import { KINDS, type Kind } from '../steps/births.ts';
import { EXPLANATION_SHARE, SHARE_OF_ROTATION } from '../steps/evidence.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { logSignPrior } from '../steps/signPrior.ts';
import type { Programme } from './programme.ts';
import { rehearse, type Stage, type Sums } from './rehearsal.ts';
import { partsNear, sizePriors } from './sizePriors.ts';
import { at, type Lags, nothing, setAside, something, total } from './weighing.ts';

/** By how much (natural log) the draw passes with a rate step of `delta` turns/day; negative: it does not. */
export type Excess = (draw: number, delta: number) => number;

/** What the bank makes of a step. */
export interface OfBank {
  readonly excess: Excess;
  /** Natural log of the weight of all gaps over that of the most probable one. */
  readonly logPlaces: (draw: number, delta: number) => number;
}

/** Gaps in which the step may be believed to lie, from the true one; each stands for those around it. */
export const OFFSETS: readonly (readonly [offset: number, standsFor: number])[] = [
  [0, 1],
  [-1, 1.5],
  [1, 1.5],
  [-3, 3.5],
  [3, 3.5],
  [-8, 8.5],
  [8, 8.5],
  [-20, 15],
  [20, 15],
];
/** The second weighing asks at the likeliest gap alone, and rivals lie near it: among the first so many. */
const LIKELY_GAPS = 3;
/** Parts of the mixture of sizes that matter at a given size. */
const PARTS = 2;
const LOG_SHARE = Math.log(EXPLANATION_SHARE / (1 - EXPLANATION_SHARE));
const LOG_SHARE_OF_ROTATION = Math.log(SHARE_OF_ROTATION / (1 - SHARE_OF_ROTATION));
/** Strengths of a walk, in those that would move the rate by the step over the arrivals there are. */
const WALK_LEVELS = [0.1, 0.4, 1.6, 6.4, 26, 100];

/**
 * The bank: odds against nothing new over the threshold, and share over every other kind of event. Whatever fails to
 * explain the arrivals may believe those up to an earlier look and set the rest aside.
 */
export function bankExcess(watch: PulsarWatch, stage: Stage, sums: readonly Sums[], lags: Lags): BankExcess {
  const { gaps, offsets, programme } = stage;
  const terms = (kind: Kind, at: Sums, rateStep: number) =>
    gaps.slice(0, kind === 'glitch' ? gaps.length : LIKELY_GAPS).flatMap((gap, g) => {
      const spread = Math.log(standsFor(offsets[g]!));
      const priors = sizePriors(watch, kind, gapDaysBefore(programme, gap));
      const parts = kind === 'glitch' ? partsNear(priors, rateStep, PARTS) : priors;
      return parts
        .filter(({ covariance }) => covariance.some((v) => v > 0))
        .map((p) => something(at, g, { ...p, logWeight: p.logWeight + spread }, lags));
    });
  const ofInstruments = KINDS.filter((kind) => kind !== 'glitch' && kind !== 'spin-down-rate change');
  const spinUp = logSignPrior(watch.model, 0);
  const changes = sums.map((at) => terms('spin-down-rate change', at, 0));
  const others = sums.map((at) => ofInstruments.flatMap((kind) => terms(kind, at, 0)));
  const quiet = sums.map((at) => nothing(at, lags));
  return (look, rateStep) => {
    const now = sums[look]!;
    const glitch = terms('glitch', now, rateStep);
    const partsOfGap = glitch.length / gaps.length;
    const byGap = gaps.map((_, g) => glitch.slice(g * partsOfGap, (g + 1) * partsOfGap));
    const logPlaces = (m: number, delta: number) => {
      const likeliest = byGap.reduce(
        (most, parts, g) => Math.max(most, total(parts, m, delta) - Math.log(standsFor(offsets[g]!))),
        -Infinity,
      );
      return Math.max(0, total(glitch, m, delta) - likeliest);
    };
    const aside = sums.slice(0, look + 1).map((before, l) => setAside(before, now, [quiet[l]!, quiet[look]!]));
    const excess: Excess = (m, delta) => {
      const own = total(glitch, m, delta);
      const enough = own - total(aside, m, delta) + spinUp - watch.settings.confirmLogOdds;
      if (enough < 0) return enough;
      const rival = (byLook: readonly (typeof glitch)[]) =>
        aside.reduce((sum, rest, l) => logAddExp(sum, total(byLook[l]!, m, delta) + at(rest, m, delta)), -Infinity);
      const change = rival(changes);
      const share = logAddExp(own, change) - rival(others) - LOG_SHARE;
      return Math.min(enough, share, own - change - LOG_SHARE_OF_ROTATION);
    };
    return { excess, logPlaces };
  };
}

function standsFor(offset: number): number {
  return OFFSETS.find(([o]) => o === offset)![1];
}

/** At a look, for rate steps of about the given size. */
export type BankExcess = (look: number, rateStep: number) => OfBank;

export function gapDaysBefore({ arrivals }: Programme, index: number): number {
  return arrivals[index]!.tDays - arrivals[index - 1]!.tDays;
}

/** A noise model that could be learned, and the programme gone through under it, by look. */
export interface Trial {
  readonly logPrior: number;
  readonly sums: readonly Sums[];
}

/** Noise so many standard deviations of what is known of it louder than the most probable one. */
export function louder({ likelyNoise, noise }: PulsarWatch, deviations: number): NoiseModel {
  // The margin of the noise that decisions use is one of them.
  const scaled = (value: number, margin: number) => value * (value > 0 ? (margin / value) ** deviations : 1);
  return {
    phaseWalk: scaled(likelyNoise.phaseWalk, noise.phaseWalk),
    frequencyWalk: scaled(likelyNoise.frequencyWalk, noise.frequencyWalk),
    torqueWalk: scaled(likelyNoise.torqueWalk, noise.torqueWalk),
    uncertaintyScale: scaled(likelyNoise.uncertaintyScale, noise.uncertaintyScale),
    floorTurns: scaled(likelyNoise.floorTurns, noise.floorTurns),
  };
}

/** The most probable noise, and louder walks that could pass for a step of about this size. */
export function trialsOf(watch: PulsarWatch, stage: Stage, rateStep: number): Trial[] {
  const { arrivals, firstAhead } = stage.programme;
  const likely = watch.likelyNoise;
  const spanDays = arrivals.at(-1)!.tDays - arrivals[0]!.tDays;
  const aheadDays = arrivals.at(-1)!.tDays - arrivals[firstAhead]!.tDays;
  const frequencyWalk = rateStep ** 2 / spanDays;
  const torqueWalk = (10 * frequencyWalk) / aheadDays ** 2;
  const noises: NoiseModel[] = [
    likely,
    louder(watch, -1),
    ...WALK_LEVELS.map((n) => ({ ...likely, frequencyWalk: likely.frequencyWalk + n * frequencyWalk })),
    ...WALK_LEVELS.map((n) => ({ ...likely, torqueWalk: likely.torqueWalk + n * torqueWalk })),
  ];
  const sigmaTurns = median(arrivals.map((a) => a.sigmaTurns));
  return noises.map((noise) => ({
    logPrior: logNoisePrior(noise, watch.prior, sigmaTurns),
    sums: rehearse({ ...stage, gaps: stage.gaps.slice(0, LIKELY_GAPS) }, noise),
  }));
}

/** The second weighing (`steps/jointOdds.ts`): each side with the noise that suits it best. */
export function jointExcess(
  watch: PulsarWatch,
  stage: Stage,
  trials: readonly Trial[],
  look: number,
  lags: Lags,
  rateStep: number,
): Excess {
  const gapDays = gapDaysBefore(stage.programme, stage.programme.firstAhead);
  const parts = partsNear(sizePriors(watch, 'glitch', gapDays), rateStep, PARTS);
  const weighed = trials.map(({ logPrior, sums }) => ({
    logPrior,
    none: nothing(sums[look]!, lags),
    byGap: sums[look]!.own.map((_, g) => parts.map((part) => something(sums[look]!, g, part, lags))),
  }));
  const spinUp = logSignPrior(watch.model, 0);
  return (m, delta) => {
    let without = -Infinity;
    let withEvent = -Infinity;
    let likeliest = weighed[0]!.byGap[0]!;
    let base = 0;
    for (const { logPrior, none, byGap } of weighed) {
      const quiet = logPrior + at(none, m, delta);
      if (quiet > without) without = quiet;
      for (const terms of byGap) {
        const struck = quiet + at(terms[0]!, m, delta);
        if (struck <= withEvent) continue;
        withEvent = struck;
        likeliest = terms;
        base = quiet;
      }
    }
    return base + total(likeliest, m, delta) - without + spinUp - watch.settings.confirmLogOdds;
  };
}
