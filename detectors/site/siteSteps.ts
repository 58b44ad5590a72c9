/**
 * The steps of the clocks of all sites, and of single receivers, from what their pulsars show together. The earliest step is
 * believed first and allowed for; then the sessions from where it was first hinted at are gone through again, until nothing common
 * is left in them. The answer is a function of the sessions alone; what was worked out before only saves work: a step is kept when all
 * that was looked at for it is as it was.
 */

import type { BelievedStep } from './belief.ts';
import type { GapSource } from './candidates.ts';
import { ClockScan, type Found, type Stretch } from './clockScan.ts';
import { byName, type Clock, clockName, clocksOf } from './clocks.ts';
import { earliestOf } from './earliestStep.ts';
import { OUT_OF_ORDER_DAYS, sameSessions } from './evidenceLog.ts';
import { HORIZON_DAYS } from './gapEvidence.ts';
import { type Late, lateTurns } from './lateTurns.ts';
import type { PulsarTimes } from './pulsarTimes.ts';
import { isOfClock, placeNamed, type SiteStep } from './siteStep.ts';
import { resized, withStep } from './stepSizes.ts';

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

const MOST_STEPS = 300;
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
    const resumed = this.#resumed(changedMjd);
    let steps: readonly BelievedStep[] = resumed?.steps ?? [];
    let fromMjd = resumed?.fromMjd ?? -Infinity;
    let before = resumed ?? null;
    while (this.#rounds.length < MOST_STEPS) {
      const { round, found } = this.#search(steps, fromMjd, { before, changedMjd });
      this.#rounds.push(round);
      if (found === null) break;
      steps = this.#measured(withStep(steps, found.step), found.step);
      fromMjd = Math.min(found.hintMjd, found.step.afterMjd);
      before = null;
    }
    return steps
      .filter((step) => Math.abs(step.stepUs) > step.uncertaintyUs)
      .sort((a, b) => a.beforeMjd - b.beforeMjd || byName(a, b));
  }

  /** The first search that saw what has changed is done again, or the last one, with all that follow. */
  #resumed(changedMjd: number): Round | undefined {
    const first = this.#rounds.findIndex(({ seenUntilMjd }) => seenUntilMjd + LOOK_AHEAD_DAYS >= changedMjd);
    const [again] = this.#rounds.splice(first);
    return again;
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
    const sureMjd = Math.min(changedMjd - LOOK_AHEAD_DAYS, before?.seenUntilMjd ?? Infinity);
    const known = new Map<string, readonly Stretch[]>();
    const scans = this.#clocks.map((clock) => {
      const name = clockName(clock.name);
      const old = before?.stretches.get(name) ?? [];
      const since = before === null ? fromMjd : this.#calmMoment(clock, old, { fromMjd, sureMjd });
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

  /** Sizes once all steps are allowed for: that of the new one, and of those of its site whose sessions it had spoilt. */
  #measured(steps: readonly BelievedStep[], news: BelievedStep): readonly BelievedStep[] {
    const spoilt = steps.filter(
      ({ site, beforeMjd }) => site === news.site && Math.abs(beforeMjd - news.beforeMjd) < HORIZON_DAYS,
    );
    return spoilt.reduceRight((measured, step) => {
      const { members, name } = this.#clocks.find((clock) => clockName(clock.name) === clockName(step))!;
      this.#tell({ members, name }, measured);
      const gaps = members.flatMap(({ log }) => log.gaps(step.afterMjd, step.beforeMjd + HORIZON_DAYS));
      return measured.map((one) => (one === step ? resized(step, gaps) : one));
    }, steps);
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
    { fromMjd, sureMjd }: { readonly fromMjd: number; readonly sureMjd: number },
  ): number {
    let moment = fromMjd;
    for (const { pulsar } of members) {
      const { places, sessions } = this.#pulsars.get(pulsar)!;
      for (let i = sessions.length - 1; i >= 0 && sessions[i]!.siteMjd > moment - OUT_OF_ORDER_DAYS; i--) {
        const { place, siteMjd } = sessions[i]!;
        if (siteMjd <= sureMjd && siteMjd > moment && isOfClock(name, placeNamed(places[place]!))) moment = siteMjd;
      }
    }
    for (const { fromMjd: begin, toMjd } of [...stretches].reverse())
      if (begin < moment && moment <= toMjd) moment = begin;
    return moment;
  }
}

function firstChange(old: PulsarTimes, times: PulsarTimes | undefined): number {
  if (times === undefined) return old.sessions[0]!.siteMjd;
  const same = sameSessions(old, times);
  const changed = [old.sessions[same], times.sessions[same]].flatMap((session) => session?.siteMjd ?? []);
  return Math.min(Infinity, ...changed) - OUT_OF_ORDER_DAYS;
}
