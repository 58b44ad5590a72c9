/**
 * The steps of the clocks of all sites, and of single receivers, from what their pulsars show together. The earliest step is
 * believed first and allowed for; then the sessions after it are gone through again, until nothing common is left in them.
 */

import { logAddExp } from '../math/logSumExp.ts';
import { type Candidate, candidates, witnessOf } from './candidates.ts';
import { type CommonStep, commonStep, testimony } from './commonStep.ts';
import { gapEvidence } from './gapEvidence.ts';
import type { PulsarTimes, Session } from './pulsarTimes.ts';
import { isAfter, isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

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

interface Clock {
  readonly site: string;
  readonly receiver: string | null;
  /** Oldest first. */
  readonly sessionsMjd: readonly number[];
  readonly members: readonly { readonly times: PulsarTimes; readonly isMember: readonly boolean[] }[];
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
const MOST_STEPS = 300;
/** Gaps this near to each other may hold one and the same step, days. */
const SAME_STEP_DAYS = 10;

/** @param all one entry a pulsar; the answer does not depend on their order. */
export function siteSteps(all: readonly PulsarTimes[]): readonly BelievedStep[] {
  const pulsars = [...all].sort((a, b) => (a.pulsar < b.pulsar ? -1 : 1));
  const clocks = clocksOf(pulsars);
  let steps: BelievedStep[] = [];
  let fromMjd = -Infinity;
  for (let round = 0; round < MOST_STEPS; round++) {
    const news = clocks.flatMap((clock) => earliest(clock, steps, fromMjd) ?? []).sort(byTime)[0];
    if (news === undefined) break;
    steps = withStep(steps, news);
    fromMjd = news.afterMjd;
  }
  return steps
    .filter((step) => Math.abs(step.stepUs) > step.uncertaintyUs)
    .sort((a, b) => a.beforeMjd - b.beforeMjd || (clockName(a) < clockName(b) ? -1 : 1));
}

/** The earliest; of what one and the same stretch of nights shows, the strongest. */
function byTime(a: BelievedStep, b: BelievedStep): number {
  if (a.site === b.site && Math.abs(a.beforeMjd - b.beforeMjd) < SAME_STEP_DAYS && a.logOdds !== b.logOdds)
    return b.logOdds - a.logOdds;
  return a.beforeMjd - b.beforeMjd || (clockName(a) < clockName(b) ? -1 : 1);
}

function clocksOf(pulsars: readonly PulsarTimes[]): Clock[] {
  const places = [...new Set(pulsars.flatMap((times) => times.places))].sort().map(placeNamed);
  const sites = [...new Set(places.map(({ site }) => site))];
  return sites.flatMap((site) => {
    const receivers = places.filter((place) => place.site === site).map(({ receiver }) => receiver);
    const own = receivers.length < 2 ? [] : receivers;
    return [null, ...own].map((receiver) => clockOf({ site, receiver }, pulsars));
  });
}

function clockOf(name: Pick<SiteStep, 'site' | 'receiver'>, pulsars: readonly PulsarTimes[]): Clock {
  const members = pulsars
    .map((times) => ({ times, isMember: times.places.map((place) => isOfClock(name, placeNamed(place))) }))
    .filter(({ times, isMember }) => times.sessions.length > 0 && isMember.includes(true));
  const sessionsMjd = new Set(
    members.flatMap(({ times, isMember }) => times.sessions.filter((s) => isMember[s.place]!).map((s) => s.siteMjd)),
  );
  return { ...name, members, sessionsMjd: [...sessionsMjd].sort((a, b) => a - b) };
}

function clockName({ site, receiver }: SiteStep): string {
  return receiver === null ? site : `${site}|${receiver}`;
}

/** The first step of one clock that the pulsars show from `fromMjd` on, beyond those believed already. */
function earliest(clock: Clock, steps: readonly SiteStep[], fromMjd: number): BelievedStep | null {
  const gaps = clock.members.flatMap(({ times, isMember }) => gapEvidence(times, isMember, lateTurns(times, steps)));
  const found: Candidate[] = [];
  let hint: Candidate | null = null;
  for (const candidate of candidates(gaps, clock.sessionsMjd, fromMjd)) {
    if (hint !== null && candidate.afterMjd > hint.beforeMjd + SAME_STEP_DAYS) {
      const step = asBelieved(clock, summit(hint, found), found);
      if (step !== null) return step;
      hint = null;
    }
    found.push(candidate);
    if (candidate.logOdds > BELIEVE_SURE_LOG_ODDS - SPREAD_NATS) hint ??= candidate;
  }
  return hint === null ? null : asBelieved(clock, summit(hint, found), found);
}

/** The most probable gap for the step that a candidate hints at. */
function summit(hint: Candidate, found: readonly Candidate[]): Candidate {
  const better = found
    .filter((c) => c.logOdds > hint.logOdds && isNear(c, hint))
    .reduce((a, b) => (b.logOdds > a.logOdds ? b : a), hint);
  return better === hint ? hint : summit(better, found);
}

/** Within days of each other, and of the same size. */
function isNear(a: Candidate, b: Candidate): boolean {
  return Math.abs(a.beforeMjd - b.beforeMjd) < SAME_STEP_DAYS && isSame(a.step, b.step);
}

function lateTurns(times: PulsarTimes, steps: readonly SiteStep[]): (session: Session) => number {
  const own = times.places.map((name) => steps.filter((step) => isOfClock(step, placeNamed(name))));
  const turnsPerUs = 1e-6 * times.frequencyHz;
  return ({ place, siteMjd }) => {
    let late = 0;
    for (const step of own[place]!) if (isAfter(step, siteMjd)) late += step.stepUs;
    return late * turnsPerUs;
  };
}

function asBelieved({ site, receiver }: Clock, best: Candidate, found: readonly Candidate[]): BelievedStep | null {
  const near = found.filter((c) => c.logOdds > best.logOdds - SPREAD_NATS && isNear(c, best));
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
    pulsars: [...new Set(shown.map((gap) => gap.pulsar.pulsar))].sort(),
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
  const byStrength = [...near].sort((a, b) => b.logOdds - a.logOdds || a.beforeMjd - b.beforeMjd);
  const heaviest = byStrength[0]!.logOdds;
  const total = near.reduce((sum, c) => sum + Math.exp(c.logOdds - heaviest), 0);
  let low = Infinity;
  let high = -Infinity;
  let held = 0;
  for (const { afterMjd, beforeMjd, logOdds } of byStrength) {
    if (held > 0.95 * total) break;
    held += Math.exp(logOdds - heaviest);
    low = Math.min(low, afterMjd);
    high = Math.max(high, beforeMjd);
  }
  return [low, high];
}

/** What is found again in the gap of a step known already is a correction of its size. */
function withStep(steps: readonly BelievedStep[], news: BelievedStep): BelievedStep[] {
  const same = steps.findIndex(
    (step) => step.site === news.site && step.receiver === news.receiver && step.afterMjd === news.afterMjd,
  );
  if (same < 0) return [...steps, news];
  const old = steps[same]!;
  const corrected = { ...old, stepUs: old.stepUs + news.stepUs, uncertaintyUs: news.uncertaintyUs };
  return steps.map((step, i) => (i === same ? corrected : step));
}
