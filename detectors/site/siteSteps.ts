/**
 * The steps of the clocks of all sites, and of single receivers, from what their pulsars show together. The earliest step is
 * believed first and allowed for; then the sessions from where it was first hinted at are gone through again, until nothing common
 * is left in them. The answer is a function of the sessions alone; what was worked out before only saves work: a step is kept when all
 * that was looked at for it is as it was.
 */

import type { BelievedStep } from './belief.ts';
import type { GapSource } from './candidates.ts';
import { type ClockName, ClockScan, type Found, SAME_STEP_DAYS, type Stretch } from './clockScan.ts';
import { EvidenceLog, OUT_OF_ORDER_DAYS, sameSessions } from './evidenceLog.ts';
import { HORIZON_DAYS } from './gapEvidence.ts';
import type { PulsarTimes } from './pulsarTimes.ts';
import { isAfter, isOfClock, placeNamed, type SiteStep } from './siteStep.ts';

/** One search for the earliest step that is left. */
interface Round {
  /** Believed before it. */
  readonly steps: readonly BelievedStep[];
  readonly fromMjd: number;
  /** By clock. */
  readonly stretches: ReadonlyMap<string, readonly Stretch[]>;
  /** The last session that was looked at in it, MJD. */
  readonly seenUntilMjd: number;
}

interface Member {
  readonly pulsar: string;
  readonly log: EvidenceLog;
}

interface Clock {
  readonly name: ClockName;
  readonly members: readonly Member[];
}

const MOST_STEPS = 300;
/** All clocks are gone through side by side, so many days at a time: what lies beyond the earliest step is not looked at. */
const SLAB_DAYS = 64;
/**
 * A gap is judged by gaps that end up to a horizon after it, and those by the sessions of another horizon; a day more, because sessions
 * are in the order of the barycentre.
 */
const LOOK_AHEAD_DAYS = 2 * HORIZON_DAYS + 1;

/** @param all one entry a pulsar; the answer does not depend on their order. */
export function siteSteps(all: readonly PulsarTimes[]): readonly BelievedStep[] {
  return new SiteClocks().steps(all);
}

export class SiteClocks {
  #pulsars: ReadonlyMap<string, PulsarTimes> = new Map();
  #clocks: readonly Clock[] = [];
  #layout = '';
  /** Turns by which the steps made each session late, with what they were worked out from. */
  readonly #late = new Map<string, Late>();
  #rounds: Round[] = [];

  /** @param all one entry a pulsar; the answer does not depend on their order. */
  steps(all: readonly PulsarTimes[]): readonly BelievedStep[] {
    const pulsars = [...all]
      .filter(({ sessions }) => sessions.length > 0)
      .sort((a, b) => (a.pulsar < b.pulsar ? -1 : 1));
    const changedMjd = this.#replace(new Map(pulsars.map((times) => [times.pulsar, times])));
    const kept = this.#rounds.findIndex(({ seenUntilMjd }) => seenUntilMjd + LOOK_AHEAD_DAYS >= changedMjd);
    const resumed = this.#rounds[kept < 0 ? this.#rounds.length : kept];
    this.#rounds.length = kept < 0 ? this.#rounds.length : kept;
    let steps = resumed?.steps ?? [];
    let fromMjd = resumed?.fromMjd ?? -Infinity;
    let before = resumed ?? null;
    while (this.#rounds.length < MOST_STEPS) {
      const { round, found } = this.#search(steps, fromMjd, { before, changedMjd });
      this.#rounds.push(round);
      if (found === null) break;
      steps = withStep(steps, found.step);
      fromMjd = Math.min(found.hintMjd, found.step.afterMjd);
      before = null;
    }
    return steps
      .filter((step) => Math.abs(step.stepUs) > step.uncertaintyUs)
      .sort((a, b) => a.beforeMjd - b.beforeMjd || byName(a, b));
  }

  /** Takes the new sessions for the old ones. The first moment at which anything is not as it was, MJD. */
  #replace(pulsars: ReadonlyMap<string, PulsarTimes>): number {
    let changedMjd = Infinity;
    for (const [name, old] of this.#pulsars) {
      const times = pulsars.get(name);
      if (times !== old) changedMjd = Math.min(changedMjd, firstChange(old, times));
      if (times === undefined) this.#late.delete(name);
    }
    for (const [name, { sessions }] of pulsars)
      if (!this.#pulsars.has(name)) changedMjd = Math.min(changedMjd, sessions[0]!.siteMjd);
    this.#pulsars = pulsars;
    const layout = JSON.stringify([...pulsars.values()].map(({ pulsar, places }) => [pulsar, places]));
    if (layout === this.#layout) return changedMjd;
    this.#layout = layout;
    this.#clocks = clocksOf([...pulsars.values()]);
    return -Infinity;
  }

  /** The earliest step that is left beyond those believed; of what one stretch of nights shows of a site, the strongest. */
  #search(
    steps: readonly BelievedStep[],
    fromMjd: number,
    { before, changedMjd }: { readonly before: Round | null; readonly changedMjd: number },
  ): { readonly round: Round; readonly found: Found | null } {
    for (const clock of this.#clocks) this.#tell(clock, steps);
    const known = new Map<string, readonly Stretch[]>();
    const scans = this.#clocks.map((clock) => {
      const name = clockName(clock.name);
      const old = before?.stretches.get(name) ?? [];
      const since = before === null ? fromMjd : this.#calmMoment(clock, old, { fromMjd, changedMjd });
      known.set(
        name,
        old.filter(({ toMjd }) => toMjd <= since),
      );
      return { name, scan: new ClockScan(clock.name, this.#sourceOf(clock, since, steps)) };
    });
    const found = earliestOf(scans.map(({ scan }) => scan));
    const stretches = new Map(scans.map(({ name, scan }) => [name, [...known.get(name)!, ...scan.stretches]]));
    const seenUntilMjd = found === null ? Infinity : Math.max(...scans.map(({ scan }) => scan.seenUntilMjd));
    return { round: { steps, fromMjd, stretches, seenUntilMjd }, found };
  }

  #tell(clock: Clock, steps: readonly BelievedStep[]): void {
    for (const { pulsar, log } of clock.members) {
      const times = this.#pulsars.get(pulsar)!;
      const felt = steps.filter((step) => times.places.some((place) => isOfClock(step, placeNamed(place))));
      const old = this.#late.get(pulsar);
      const isSame =
        old?.times === times && old.steps.length === felt.length && felt.every((s, i) => s === old.steps[i]);
      const late = isSame ? old : { times, steps: felt, turns: lateTurns(times, felt) };
      if (!isSame) this.#late.set(pulsar, late);
      log.take(times, late.turns);
    }
  }

  #sourceOf({ members, name }: Clock, sinceMjd: number, steps: readonly SiteStep[]): GapSource {
    const own = steps.filter((step) => clockName(step) === clockName(name));
    const sessionsMjd = new Set<number>();
    for (const { pulsar } of members) {
      const { places, sessions } = this.#pulsars.get(pulsar)!;
      const isMember = places.map((place) => isOfClock(name, placeNamed(place)));
      for (let i = sessions.length - 1; i >= 0 && sessions[i]!.siteMjd >= sinceMjd - OUT_OF_ORDER_DAYS; i--) {
        const { place, siteMjd } = sessions[i]!;
        if (isMember[place]! && siteMjd >= sinceMjd) sessionsMjd.add(siteMjd);
      }
    }
    return {
      sessionsMjd: [...sessionsMjd].sort((a, b) => a - b),
      gaps: (fromMjd, toMjd) => members.flatMap(({ log }) => log.gaps(fromMjd, toMjd)),
      known: new Set(own.map(({ afterMjd }) => afterMjd)),
    };
  }

  /** The last session of the clock up to which all is as it was, and at which no stretch was open. */
  #calmMoment(
    { name, members }: Clock,
    stretches: readonly Stretch[],
    { fromMjd, changedMjd }: { readonly fromMjd: number; readonly changedMjd: number },
  ): number {
    const sure = changedMjd - LOOK_AHEAD_DAYS;
    let moment = fromMjd;
    for (const { pulsar } of members) {
      const { places, sessions } = this.#pulsars.get(pulsar)!;
      for (let i = sessions.length - 1; i >= 0 && sessions[i]!.siteMjd > moment - OUT_OF_ORDER_DAYS; i--) {
        const { place, siteMjd } = sessions[i]!;
        if (siteMjd <= sure && siteMjd > moment && isOfClock(name, placeNamed(places[place]!))) moment = siteMjd;
      }
    }
    for (const { fromMjd: begin, toMjd } of [...stretches].reverse())
      if (begin < moment && moment < toMjd) moment = begin;
    return moment;
  }
}

/** All scans taken on side by side, until one finds a step and no other can find an earlier one. */
function earliestOf(scans: readonly ClockScan[]): Found | null {
  const found = new Map<ClockScan, Found>();
  let untilMjd = -Infinity;
  while (scans.some((scan) => !scan.ended && !found.has(scan)) || found.size > 0) {
    for (const scan of scans) {
      const next = found.has(scan) ? null : scan.next(untilMjd);
      if (next !== null) found.set(scan, next);
    }
    if (found.size === 0) {
      untilMjd = Math.min(...scans.filter(({ ended }) => !ended).map(({ seenUntilMjd }) => seenUntilMjd)) + SLAB_DAYS;
      continue;
    }
    const neededMjd = Math.min(...[...found.values()].map(({ step }) => step.beforeMjd)) + SAME_STEP_DAYS;
    if (neededMjd <= untilMjd) return choice([...found.values()]);
    untilMjd = neededMjd;
  }
  return null;
}

function choice(found: readonly Found[]): Found {
  const inOrder = [...found].sort((a, b) => a.step.beforeMjd - b.step.beforeMjd || byName(a.step, b.step));
  const first = inOrder[0]!;
  return inOrder
    .filter(({ step }) => step.site === first.step.site && step.beforeMjd < first.step.beforeMjd + SAME_STEP_DAYS)
    .reduce((a, b) => (b.step.logOdds > a.step.logOdds ? b : a));
}

function firstChange(old: PulsarTimes, times: PulsarTimes | undefined): number {
  if (times === undefined) return old.sessions[0]!.siteMjd;
  const same = sameSessions(old, times);
  const changed = [old.sessions[same], times.sessions[same]].flatMap((session) => session?.siteMjd ?? []);
  return Math.min(Infinity, ...changed) - OUT_OF_ORDER_DAYS;
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

function clockOf(name: ClockName, pulsars: readonly PulsarTimes[]): Clock {
  const members = pulsars.flatMap(({ pulsar, places }) => {
    const isMember = places.map((place) => isOfClock(name, placeNamed(place)));
    return isMember.includes(true) ? [{ pulsar, log: new EvidenceLog(isMember) }] : [];
  });
  return { name, members };
}

function clockName({ site, receiver }: ClockName): string {
  return receiver === null ? site : `${site}|${receiver}`;
}

function byName(a: ClockName, b: ClockName): number {
  return clockName(a) < clockName(b) ? -1 : 1;
}

interface Late {
  readonly times: PulsarTimes;
  readonly steps: readonly SiteStep[];
  readonly turns: Float64Array;
}

function lateTurns({ places, frequencyHz, sessions }: PulsarTimes, steps: readonly SiteStep[]): Float64Array {
  const own = places.map((name) => steps.filter((step) => isOfClock(step, placeNamed(name))));
  const turnsPerUs = 1e-6 * frequencyHz;
  const turns = new Float64Array(sessions.length);
  sessions.forEach(({ place, siteMjd }, i) => {
    let late = 0;
    for (const step of own[place]!) if (isAfter(step, siteMjd)) late += step.stepUs;
    turns[i] = late * turnsPerUs;
  });
  return turns;
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
