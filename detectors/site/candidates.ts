/**
 * Every gap between the sessions of a site, in order of time, with the pulsars that speak of it. A gap in which their phases
 * moved in no way is passed over at the cost of a few additions; the others are weighed.
 */

import { type CommonStep, commonStep, type Witness } from './commonStep.ts';
import { type GapEvidence, HORIZON_DAYS, type PhaseStep } from './gapEvidence.ts';

/** A gap of the site that may hold a step of its clock. */
export interface Candidate {
  readonly afterMjd: number;
  readonly beforeMjd: number;
  /** Natural log of posterior odds: a step in this gap against none, its rate included. */
  readonly logOdds: number;
  readonly logBayesFactor: number;
  readonly step: CommonStep;
  readonly evidence: readonly GapEvidence[];
  readonly phaseOf: (gap: GapEvidence) => PhaseStep;
}

/**
 * Which sessions after the gap are heard: a step that is undone within days shows in the first sessions alone, a lasting one
 * shows best in all of them.
 */
const HEARINGS: readonly { readonly days: number; readonly phaseOf: (gap: GapEvidence) => PhaseStep }[] = [
  { days: 1, phaseOf: (gap) => gap.first },
  { days: 5, phaseOf: (gap) => gap.first },
  { days: HORIZON_DAYS, phaseOf: (gap) => gap.all },
];
/** Steps of one clock a year (common practice, no source). */
export const CLOCK_STEPS_PER_YEAR = 0.03;
const DAYS_PER_YEAR = 365.25;
/** A pulsar that stepped by more σ is not added to the sum but counted. */
const STRANGE_SIGMAS = 4;
/** σ of the small steps that the quick look is for, seconds. */
const QUICK_SIZES_S = [3e-5, 1e-3];
/** Weighed in full from this quick ln Bayes factor on, or when so many pulsars, and this share of all, are off. */
const QUICK_NATS = 4;
const STRANGE_PULSARS = 2;
const STRANGE_SHARE = 0.25;

export function witnessOf({ pulsar, afterMjd, beforeMjd }: GapEvidence, phase: PhaseStep): Witness {
  return { frequencyHz: pulsar.frequencyHz, gapDays: beforeMjd - afterMjd, ...phase };
}

/**
 * The gaps after `fromMjd` that may hold a step, in order of time, each weighed when it is asked for.
 * @param gaps of all pulsars of one clock
 * @param sessionsMjd of that clock, oldest first
 */
export function* candidates(
  gaps: readonly GapEvidence[],
  sessionsMjd: readonly number[],
  fromMjd: number,
): Generator<Candidate> {
  const hearings = HEARINGS.map(({ days, phaseOf }) => ({ phaseOf, ...sweepOf(gaps, days, phaseOf) }));
  for (let i = 1; i < sessionsMjd.length; i++) {
    const [afterMjd, beforeMjd] = [sessionsMjd[i - 1]!, sessionsMjd[i]!];
    if (afterMjd < fromMjd) continue;
    const heard = hearings.flatMap((hearing) => {
      const evidence = hearing.advanceTo(beforeMjd);
      if (evidence === null) return [];
      const step = commonStep(evidence.map((gap) => witnessOf(gap, hearing.phaseOf(gap))));
      return [{ evidence, step, phaseOf: hearing.phaseOf }];
    });
    if (heard.length === 0) continue;
    const best = heard.reduce((a, b) => (b.step.logBayesFactor > a.step.logBayesFactor ? b : a));
    const { logBayesFactor } = best.step;
    const chance = (CLOCK_STEPS_PER_YEAR * (beforeMjd - afterMjd)) / DAYS_PER_YEAR;
    const logOdds = logBayesFactor - Math.log(HEARINGS.length) + Math.log(chance);
    yield { afterMjd, beforeMjd, logOdds, logBayesFactor, ...best };
  }
}

/** The pulsars that speak of the moment, kept up to date as it moves on. */
function sweepOf(gaps: readonly GapEvidence[], days: number, phaseOf: (gap: GapEvidence) => PhaseStep) {
  const begins = gaps
    .map((gap) => ({ gap, mjd: Math.max(gap.afterMjd, gap.beforeMjd - days) }))
    .sort((a, b) => a.mjd - b.mjd);
  const ends = [...gaps].sort((a, b) => a.beforeMjd - b.beforeMjd);
  const active = new Set<GapEvidence>();
  const sum = { information: 0, pull: 0, strange: 0 };
  const add = (gap: GapEvidence, sign: number) => {
    const { turns, variance } = phaseOf(gap);
    const { frequencyHz: nu } = gap.pulsar;
    if (turns * turns > STRANGE_SIGMAS ** 2 * variance) sum.strange += sign;
    else {
      sum.information += (sign * nu * nu) / variance;
      sum.pull += (sign * nu * turns) / variance;
    }
  };
  let begun = 0;
  let ended = 0;
  return {
    /** To the last moment before a session. Null: nothing there that is worth weighing. */
    advanceTo(mjd: number): GapEvidence[] | null {
      for (; begun < begins.length && begins[begun]!.mjd < mjd; begun++) {
        active.add(begins[begun]!.gap);
        add(begins[begun]!.gap, 1);
      }
      for (; ended < ends.length && ends[ended]!.beforeMjd < mjd; ended++) {
        active.delete(ends[ended]!);
        add(ends[ended]!, -1);
      }
      return active.size >= 2 && isNoteworthy(sum, active.size) ? [...active] : null;
    },
  };
}

function isNoteworthy(sum: { information: number; pull: number; strange: number }, pulsars: number): boolean {
  if (sum.strange >= STRANGE_PULSARS && sum.strange >= STRANGE_SHARE * pulsars) return true;
  return QUICK_SIZES_S.some((sigma) => {
    const gain = (0.5 * sum.pull ** 2) / (sum.information + 1 / sigma ** 2);
    return gain - 0.5 * Math.log1p(Math.max(0, sum.information) * sigma ** 2) > QUICK_NATS;
  });
}
