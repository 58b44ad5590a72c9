/** When a clock is held to have stepped, by which pulsars, and where the step lies. */

import { logAddExp } from '../math/logSumExp.ts';
import { type Candidate, witnessOf } from './candidates.ts';
import { type CommonStep, commonStep, testimony } from './commonStep.ts';
import type { SiteStep } from './siteStep.ts';

/** A step that is believed, with what was found of it. */
export interface BelievedStep extends SiteStep {
  /** Natural log of posterior odds, over all gaps near it. */
  readonly logOdds: number;
  readonly logBayesFactor: number;
  /** Bounds of the gaps that hold it with 95 % probability, MJD as the site's clock reads. */
  readonly interval95: readonly [number, number];
  /** Those that show it, and no other. */
  readonly pulsars: readonly string[];
  /** The sessions by which they do, MJD, oldest first. */
  readonly shownAtMjd: readonly number[];
  /** The session that was enough to believe it, MJD. */
  readonly confirmedAtMjd: number;
}

/**
 * Natural log of posterior odds. Against noise, the floor that holds for events of pulsars too. Where two pulsars or more are sure, each
 * by itself, that they stepped, noise is out of the question, and chance alone could make two events of their own agree.
 */
const BELIEVE_LOG_ODDS = 9;
const BELIEVE_SURE_LOG_ODDS = 5;
const SURE_PULSARS = 2;
const SURE_NATS = 6;
/** Else so many pulsars must show it, each at least a little. */
const LEAST_PULSARS = 3;
const LITTLE_NATS = 0.5;
const LEAST_AGREEMENT = 0.5;
/** A step shows in a pulsar that it moved by so many σ. */
const SHOWN_SIGMAS = 2;
/** Gaps that are this much less probable than the best are not looked at for where it happened. */
const SPREAD_NATS = 10;
/** From these odds on, a gap may have a part in a step that is believed. */
export const HINT_LOG_ODDS = BELIEVE_SURE_LOG_ODDS - SPREAD_NATS;

/**
 * The step in the gap `best`, if there is one.
 * @param stretch the gaps around it that hint at a step, `best` among them
 */
export function believed(
  { site, receiver }: Pick<SiteStep, 'site' | 'receiver'>,
  best: Candidate,
  stretch: readonly Candidate[],
): BelievedStep | null {
  const near = stretch.filter((c) => c.logWeight > best.logWeight - SPREAD_NATS && isSame(c.step, best.step));
  const logOdds = near.reduce((sum, c) => logAddExp(sum, c.logOdds), -Infinity);
  if (logOdds < BELIEVE_SURE_LOG_ODDS) return null;
  const shown = best.evidence.filter((gap) => {
    const witness = witnessOf(gap, best.phaseOf(gap));
    const { logRatio, agrees } = testimony(witness, best.step);
    const sigmas = Math.abs(best.step.stepS * witness.frequencyHz) / Math.sqrt(witness.variance);
    return agrees > LEAST_AGREEMENT && (logRatio > LITTLE_NATS || sigmas > SHOWN_SIGMAS);
  });
  const logRatios = shown.map((gap) => testimony(witnessOf(gap, best.phaseOf(gap)), best.step).logRatio);
  const count = (nats: number) => logRatios.filter((logRatio) => logRatio > nats).length;
  const isSure = count(SURE_NATS) >= SURE_PULSARS;
  if (!isSure && (logOdds < BELIEVE_LOG_ODDS || count(LITTLE_NATS) < LEAST_PULSARS)) return null;
  const { afterMjd, beforeMjd, logBayesFactor, step } = best;
  return {
    site,
    receiver,
    afterMjd,
    beforeMjd,
    stepUs: step.stepS * 1e6,
    uncertaintyUs: step.uncertaintyS * 1e6,
    logOdds,
    logBayesFactor,
    interval95: interval95(near),
    pulsars: [...new Set(shown.map((gap) => gap.pulsar))].sort(),
    shownAtMjd: shown.map((gap) => gap.beforeMjd).sort((a, b) => a - b),
    confirmedAtMjd: enoughAt(best, logOdds - logBayesFactor),
  };
}

/** The first session with which the pulsars until then were enough. */
function enoughAt({ evidence, phaseOf }: Candidate, logPrior: number): number {
  const inOrder = [...evidence].sort((a, b) => a.beforeMjd - b.beforeMjd);
  for (let count = 2; count < inOrder.length; count++) {
    const heard = inOrder.slice(0, count).map((gap) => witnessOf(gap, phaseOf(gap)));
    if (commonStep(heard).logBayesFactor + logPrior >= BELIEVE_LOG_ODDS) return inOrder[count - 1]!.beforeMjd;
  }
  return inOrder.at(-1)!.beforeMjd;
}

function isSame(a: CommonStep, b: CommonStep): boolean {
  return Math.abs(a.stepS - b.stepS) < 3 * Math.hypot(a.uncertaintyS, b.uncertaintyS);
}

function interval95(near: readonly Candidate[]): readonly [number, number] {
  const byStrength = [...near].sort((a, b) => b.logWeight - a.logWeight || a.beforeMjd - b.beforeMjd);
  const weights = byStrength.map((c) => Math.exp(c.logWeight - byStrength[0]!.logWeight));
  const total = weights.reduce((sum, weight) => sum + weight, 0);
  let low = Infinity;
  let high = -Infinity;
  let held = 0;
  for (const [i, { afterMjd, beforeMjd }] of byStrength.entries()) {
    if (held > 0.95 * total) break;
    held += weights[i]!;
    low = Math.min(low, afterMjd);
    high = Math.max(high, beforeMjd);
  }
  return [low, high];
}
