/**
 * Every gap between the sessions of a site, in order of time, with the pulsars that speak of it. A gap in which their phases
 * moved in no way is passed over at the cost of a few additions; the others are weighed.
 */

import { type CommonStep, commonStep, fitGain, type Witness } from './commonStep.ts';
import { type GapEvidence, HORIZON_DAYS, type PhaseStep } from './gapEvidence.ts';

/** A gap of the site that may hold a step of its clock. */
export interface Candidate {
  readonly afterMjd: number;
  readonly beforeMjd: number;
  /** Natural log of posterior odds: a step in this gap against none, its rate included. */
  readonly logOdds: number;
  readonly logBayesFactor: number;
  readonly step: CommonStep;
  /** ln of how well the phases fit with the step, times its chance: by it the gaps near each other are told apart. */
  readonly logWeight: number;
  readonly evidence: readonly GapEvidence[];
  readonly phaseOf: (gap: GapEvidence) => PhaseStep;
}

/** A gap of the clock, not yet weighed. */
export interface Gap {
  readonly afterMjd: number;
  readonly beforeMjd: number;
  readonly isOnGrid: boolean;
  /** Null: nothing moved in it. */
  readonly weigh: (() => Candidate) | null;
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

export function witnessOf({ frequencyHz, afterMjd, beforeMjd }: GapEvidence, phase: PhaseStep): Witness {
  return { frequencyHz, gapDays: beforeMjd - afterMjd, ...phase };
}

/** The gaps between the sessions of one clock as its pulsars show them, handed out in order of time. */
export interface GapSource {
  /** From the session on with which the look begins, oldest first, MJD. */
  readonly sessionsMjd: readonly number[];
  /** Of all pulsars: those that end after one moment and not after another, MJD. */
  readonly gaps: (fromMjd: number, toMjd: number) => readonly GapEvidence[];
  /** `afterMjd` of the steps of this clock that are known. */
  readonly known: ReadonlySet<number>;
}

/** Evidence is asked for so many days at a time. */
const PORTION_DAYS = 32;

/**
 * In a night of many sessions not every gap is weighed at once: the first that crosses a point of this grid stands for those around it,
 * days.
 */
export const GRID_DAYS = 1 / 16;

/** Every gap in order of time. */
export function* candidates({ sessionsMjd, gaps, known }: GapSource): Generator<Gap> {
  const hearings = HEARINGS.map(({ days, phaseOf }) => ({ phaseOf, sweep: new Sweep(days, phaseOf) }));
  let askedUntilMjd = sessionsMjd[0] ?? 0;
  for (let i = 1; i < sessionsMjd.length; i++) {
    const [afterMjd, beforeMjd] = [sessionsMjd[i - 1]!, sessionsMjd[i]!];
    if (beforeMjd + HORIZON_DAYS > askedUntilMjd) {
      const portion = gaps(askedUntilMjd, beforeMjd + HORIZON_DAYS + PORTION_DAYS);
      for (const { sweep } of hearings) sweep.add(portion);
      askedUntilMjd = beforeMjd + HORIZON_DAYS + PORTION_DAYS;
    }
    const heard: Heard[] = [];
    for (const { phaseOf, sweep } of hearings) {
      const evidence = sweep.at(beforeMjd);
      const last = heard.at(-1);
      if (evidence !== null && !(last?.phaseOf === phaseOf && isSameList(last.evidence, evidence)))
        heard.push({ evidence, phaseOf });
    }
    const isKnown = known.has(afterMjd);
    const isOnGrid = isKnown || Math.floor(beforeMjd / GRID_DAYS) !== Math.floor(afterMjd / GRID_DAYS);
    const weigh = heard.length === 0 ? null : () => weighed(heard, { afterMjd, beforeMjd, isKnown });
    yield { afterMjd, beforeMjd, isOnGrid, weigh };
  }
}

type Heard = Pick<Candidate, 'evidence' | 'phaseOf'>;

function weighed(
  heard: readonly Heard[],
  { isKnown, ...gap }: { readonly afterMjd: number; readonly beforeMjd: number; readonly isKnown: boolean },
): Candidate {
  const [best] = heard
    .map(({ evidence, phaseOf }) => {
      const witnesses = evidence.map((one) => witnessOf(one, phaseOf(one)));
      return { evidence, phaseOf, witnesses, step: commonStep(witnesses) };
    })
    .sort((a, b) => b.step.logBayesFactor - a.step.logBayesFactor);
  const { witnesses, ...what } = best!;
  const { logBayesFactor, stepS } = what.step;
  // A step that is known needs no chance to happen: what is left of it in its gap is an error of its size.
  const chance = isKnown ? 1 : Math.min(1, (CLOCK_STEPS_PER_YEAR * (gap.beforeMjd - gap.afterMjd)) / DAYS_PER_YEAR);
  const logOdds = logBayesFactor - Math.log(HEARINGS.length) + Math.log(chance);
  const logWeight = fitGain(witnesses, stepS) + Math.log(chance);
  return { ...gap, ...what, logOdds, logBayesFactor, logWeight };
}

function isSameList(a: readonly GapEvidence[], b: readonly GapEvidence[]): boolean {
  return a.length === b.length && a.every((gap, i) => gap === b[i]);
}

interface Spoken {
  readonly gap: GapEvidence;
  /** It speaks of moments after this one, MJD. */
  readonly fromMjd: number;
  readonly isStrange: boolean;
  readonly information: number;
  readonly pull: number;
}

/** The pulsars that speak of a moment which only moves on. */
class Sweep {
  readonly #days: number;
  readonly #phaseOf: (gap: GapEvidence) => PhaseStep;
  /** Last come first. */
  #waiting: Spoken[] = [];
  readonly #active: Spoken[] = [];

  constructor(days: number, phaseOf: (gap: GapEvidence) => PhaseStep) {
    this.#days = days;
    this.#phaseOf = phaseOf;
  }

  add(gaps: readonly GapEvidence[]): void {
    const more = gaps.map((gap) => spoken(gap, this.#days, this.#phaseOf(gap)));
    this.#waiting = [...this.#waiting, ...more].sort(lastFirst);
  }

  /** Null: they say nothing that is worth weighing. */
  at(mjd: number): GapEvidence[] | null {
    const active = this.#active;
    let kept = 0;
    for (const one of active) if (one.gap.beforeMjd >= mjd) active[kept++] = one;
    active.length = kept;
    for (let next = this.#waiting.at(-1); next !== undefined && next.fromMjd < mjd; next = this.#waiting.at(-1)) {
      this.#waiting.pop();
      if (next.gap.beforeMjd >= mjd) active.push(next);
    }
    return active.length >= 2 && isNoteworthy(active) ? active.map(({ gap }) => gap) : null;
  }
}

/** The order in which they are heard is always the same one. */
function lastFirst(a: Spoken, b: Spoken): number {
  return b.fromMjd - a.fromMjd || (a.gap.pulsar < b.gap.pulsar ? 1 : -1);
}

function spoken(gap: GapEvidence, days: number, { turns, variance }: PhaseStep): Spoken {
  const nu = gap.frequencyHz;
  const fromMjd = Math.max(gap.afterMjd, gap.beforeMjd - days);
  const isStrange = turns * turns > STRANGE_SIGMAS ** 2 * variance;
  return { gap, fromMjd, isStrange, information: (nu * nu) / variance, pull: (nu * turns) / variance };
}

function isNoteworthy(active: readonly Spoken[]): boolean {
  let strange = 0;
  let information = 0;
  let pull = 0;
  for (const one of active) {
    if (one.isStrange) strange++;
    else {
      information += one.information;
      pull += one.pull;
    }
  }
  if (strange >= STRANGE_PULSARS && strange >= STRANGE_SHARE * active.length) return true;
  return QUICK_SIZES_S.some((sigma) => {
    const gain = (0.5 * pull ** 2) / (information + 1 / sigma ** 2);
    return gain - 0.5 * Math.log1p(information * sigma ** 2) > QUICK_NATS;
  });
}
