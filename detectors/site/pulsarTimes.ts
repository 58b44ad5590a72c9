/**
 * What the clock of a site is judged by: one pulsar's sessions as the pulsar was followed by itself, with no step of any
 * site known. A function of the pulsar's own arrivals, so that what is decided of a site does not depend on the order in
 * which its pulsars' files came in.
 */

import { arrivalVariance, type Walks } from '../filter/stateSpace.ts';
import { bestOf, countedArrivals } from '../steps/counts.ts';
import type { Hypothesis } from '../steps/hypothesis.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { dispersionWeight } from '../steps/timeline.ts';
import { siteMjdOf } from './siteStep.ts';

export interface PulsarTimes {
  readonly pulsar: string;
  readonly frequencyHz: number;
  readonly walks: Walks;
  /** Site and receiver, as `site|receiver`. */
  readonly places: readonly string[];
  readonly sessions: readonly Session[];
}

/** The arrivals of one receiver in one session, as their weighted mean. */
export interface Session {
  /** MJD as the site's clock reads. */
  readonly siteMjd: number;
  /** Days from the spin epoch. */
  readonly tDays: number;
  /** Against the start model, counted by the pulsar's own hypotheses; late is positive. */
  readonly deviationTurns: number;
  readonly varianceTurns2: number;
  /** Index into `places`. */
  readonly place: number;
  /** The pulsar's rotation was set free in the gap before: it is held to have glitched. */
  readonly freed: boolean;
}

/** Empty until the pulsar is locked: without a count it can say nothing of a clock. */
export function pulsarTimes(watch: PulsarWatch): PulsarTimes {
  const { line, model, noise } = watch;
  const { phaseWalk, frequencyWalk, torqueWalk } = noise;
  return {
    pulsar: model.name,
    frequencyHz: model.spin.frequencyHz.hi,
    walks: { phaseWalk, frequencyWalk, torqueWalk },
    places: [...line.groups],
    sessions: watch.bank === null || !watch.locked ? [] : sessionsOf(watch),
  };
}

/** A state to within half its uncertainty: so that a new arrival that moves its last digit leaves the sessions of before as they were. */
function settled({ mean, cov }: Hypothesis, state: number): number {
  const unit = 2 ** (Math.floor(Math.log2(Math.sqrt(cov[state * mean.length + state]!))) - 1);
  return unit > 0 && Number.isFinite(unit) ? Math.round(mean[state]! / unit) * unit : mean[state]!;
}

function sessionsOf(watch: PulsarWatch): Session[] {
  const { line, noise, states, tracks } = watch;
  const best = bestOf(watch);
  const counted = countedArrivals(watch, best);
  const dispersion = states.dispersion === null ? 0 : settled(best, states.dispersion);
  const own = new Set(tracks.filter((t) => t.state === 'confirmed' && t.kind !== 'clock step').map((t) => t.bestGap));
  const sessions: Session[] = [];
  const open = new Map<number, number[]>();
  const close = () => {
    for (const [place, members] of open) sessions.push(meanOf(place, members));
    open.clear();
  };
  const meanOf = (place: number, members: readonly number[]): Session => {
    let weight = 0;
    const sum = { siteMjd: 0, tDays: 0, deviationTurns: 0 };
    for (const i of members) {
      const { arrival, sigmaTurns, tDays } = line.seen[i]!;
      const own = 1 / arrivalVariance(sigmaTurns, noise);
      const late =
        dispersion === 0
          ? 0
          : dispersion * (dispersionWeight(arrival.frequencyMhz) - dispersionWeight(line.firstBandMhz!));
      weight += own;
      sum.siteMjd += own * siteMjdOf(arrival);
      sum.tDays += own * tDays;
      sum.deviationTurns += own * (counted[i]!.deviationTurns - late);
    }
    return {
      siteMjd: sum.siteMjd / weight,
      tDays: sum.tDays / weight,
      deviationTurns: sum.deviationTurns / weight,
      varianceTurns2: 1 / weight,
      place,
      freed: members.some((i) => own.has(i)),
    };
  };
  line.seen.forEach((seen, i) => {
    if (i > 0 && line.seen[i - 1]!.session !== seen.session) close();
    const members = open.get(seen.group);
    if (members === undefined) open.set(seen.group, [i]);
    else members.push(i);
  });
  close();
  return sessions.sort((a, b) => a.tDays - b.tDays);
}
