/** What has been believed of each arrival, and of the events among them: the ground for fits and for learning the noise. */

import type { CountedArrival, Disturbance } from '../filter/countedArrival.ts';
import type { Hypothesis, Story } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { groupsOfSite } from './timeline.ts';
import { gapsOfEvent, type Track } from './track.ts';

/** The heaviest hypothesis of all, event or not. */
export function bestOf(watch: PulsarWatch): Hypothesis {
  const bank = watch.bank!;
  let best = bank.beam[0]!;
  for (const family of bank.families) for (const h of family.beam) if (h.logWeight > best.logWeight) best = h;
  return best;
}

/** The arrivals with the whole turns that the hypothesis gives them. */
export function countedArrivals(watch: PulsarWatch, h: Hypothesis): CountedArrival[] {
  const decisions: Story[] = new Array(watch.line.seen.length);
  for (let s = h.story; s !== null; s = s.before) decisions[s.index] = s;
  return watch.line.seen.map((seen, i) => ({
    tDays: seen.tDays,
    deviationTurns: seen.deviation + decisions[i]!.turns,
    sigmaTurns: seen.sigmaTurns,
    frequencyMhz: seen.arrival.frequencyMhz,
    group: seen.group,
    used: decisions[i]!.used,
  }));
}

/** Natural-log odds from which a suspicion is kept out of the noise. */
const WORTH_NAMING = 3;

/**
 * Events as free steps of their own, so that they are neither learned as noise nor found again. `except` and its parts are
 * not: but each switch between two spin-down rates stands for itself.
 */
export function disturbances(watch: PulsarWatch, except?: Track): Disturbance[] {
  const isOf = (t: Track) => t.number === except?.number || (except?.modes === null && t.partOf === except.number);
  return watch.tracks
    .filter((t) => !isOf(t))
    .filter((t) => t.state === 'confirmed' || (t.state === 'suspected' && t.logOdds > WORTH_NAMING))
    .flatMap((t) => freedGaps(watch, t));
}

/** What an event sets free, and where. */
export function freedGaps(watch: PulsarWatch, track: Track): Disturbance[] {
  return gapsOfEvent(track).flatMap((beforeIndex) => freed(watch, track).map((what) => ({ beforeIndex, ...what })));
}

function freed(watch: PulsarWatch, track: Track): Omit<Disturbance, 'beforeIndex'>[] {
  if (track.kind === 'dispersion step' && watch.states.dispersion !== null) return [{ kind: 'dispersion' }];
  if (track.kind !== 'clock step') return [{ kind: 'spin' }];
  const groups = groupsOfSite(watch.line, track.bestGap);
  return groups === null ? [{ kind: 'phase' }] : groups.map((group) => ({ kind: 'offset', group }));
}
