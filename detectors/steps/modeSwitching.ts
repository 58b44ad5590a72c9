/**
 * Some pulsars switch between two spin-down rates (Lyne et al. 2010, Science 329, 408). One switch looks like torque noise,
 * and several look like several events: only the whole chain tells. So each time the noise is learned, a pulsar that
 * wanders is gone through again as one that switches; if that explains the record better, it is said once, and the switches
 * before and after are parts of that event.
 */

import type { CountedArrival } from '../filter/countedArrival.ts';
import { learnNoise, logNoisePrior } from '../filter/noiseLearning.ts';
import type { NoisePrior } from '../filter/noisePrior.ts';
import type { NoiseModel } from '../report.ts';
import { RATE_PER_YEAR } from './births.ts';
import { bestOf, countedArrivals, disturbances } from './counts.ts';
import { withoutRecoveries } from './establishedRecoveries.ts';
import { newTrack } from './newTrack.ts';
import { asFixed, type PulsarWatch } from './pulsarWatch.ts';
import { decisionsOf } from './retrace.ts';
import { LOG_RISE_PRIOR, LONGEST_RISE_DAYS } from './slowSpinUp.ts';
import { foundStartRate } from './start.ts';
import { type Past, SWITCHES_PER_YEAR, type SwitchChains, steadyEvidence, switchChains } from './switchChain.ts';
import { isSwitch, type Modes, switchingRecord } from './switchingRecord.ts';
import { slowRise, type Track } from './track.ts';

/** Share of pulsars that switch (common practice, no source). */
const PRIOR_SHARE = 0.01;
/**
 * Natural-log odds from which a pulsar is said to switch. In forty simulated years noise reached 6 in 3 of 60 pulsars; simulated
 * switchers reach 70 and more.
 */
const LEAST_LOG_ODDS = 20;
/** Events of a pulsar that may be switches. */
const LEAST_CHANGES = 3;
/** Only a pulsar whose walk over so long is so many times its uncertainties may hide switches in it. */
const WALK_DAYS = 200;
const LEAST_WALK = 8;
/** Torque and frequency walks of a pulsar whose switches are known, in scatters of the population prior. */
const QUIET_TORQUE = -1.5;
const QUIET_FREQUENCY = [-1, 0];
/** A suspicion so many arrivals from a switch is the switch. */
const NEAR_GAPS = 3;
const DAYS_PER_YEAR = 365.25;

/** Its walk may hide switches, or it is known to switch. */
function wanders(watch: PulsarWatch): boolean {
  const walk = walkOver(watch.likelyNoise);
  return switchingRecord(watch) !== undefined || walk > LEAST_WALK * medianSigma(watch.line.seen);
}

/** Names the pulsar, or takes the name back; true where switches are known now that were not. */
export function seekSwitching(watch: PulsarWatch, index: number): boolean {
  const confirmed = watch.tracks.filter((t) => t.state === 'confirmed');
  const known = switchingRecord(watch);
  if (known === undefined && !wanders(watch) && !showsChanges(watch)) return false;
  const best = bestOf(watch);
  const counted = countedArrivals(watch, best);
  const past = { decisions: decisionsOf(best), startRate: foundStartRate(counted) };
  const others = confirmed.filter((t) => !isSwitch(watch, t));
  const steady = steadyOdds(watch, { ...past, tracks: others }, counted);
  const { many, few } = bestChains(watch, past, others, medianSigma(counted));
  const logOdds = Math.log(PRIOR_SHARE) + many.logEvidence - Math.max(steady, few.logEvidence);
  if (logOdds >= LEAST_LOG_ODDS) {
    adopt(watch, index, many, logOdds);
    return true;
  }
  if (known === undefined && few.logEvidence > many.logEvidence && seeRise(watch, index, few, steady)) return true;
  if (known !== undefined && logOdds < 0)
    for (const t of confirmed) if (isSwitch(watch, t)) Object.assign(t, { state: 'withdrawn', logOdds, settled: true });
  return false;
}

/** So many changes that they may be switches, also where noise was thought the better explanation later. */
function showsChanges({ tracks }: PulsarWatch): boolean {
  return tracks.filter((t) => t.confirmedAt !== null && isMaybeSwitch(t)).length >= LEAST_CHANGES;
}

function isMaybeSwitch(track: Track): boolean {
  return track.kind === 'spin-down-rate change' || track.kind === 'glitch';
}

function medianSigma(arrivals: readonly { readonly sigmaTurns: number }[]): number {
  const sigmas = arrivals.map((a) => a.sigmaTurns).sort((a, b) => a - b);
  return sigmas[sigmas.length >> 1]!;
}

/** RMS in turns. */
function walkOver({ torqueWalk, frequencyWalk }: NoiseModel): number {
  return Math.sqrt((torqueWalk * WALK_DAYS ** 5) / 20 + (frequencyWalk * WALK_DAYS ** 3) / 3);
}

/** Noise as loud as it has to be, and the events believed so far, each at its prior rate. */
function steadyOdds(watch: PulsarWatch, past: Past, counted: readonly CountedArrival[]): number {
  const { seen } = watch.line;
  const known = disturbances({ ...watch, tracks: [...past.tracks] });
  const steady = withoutRecoveries(watch, counted);
  const noise = asFixed(watch.model, learnNoise(steady, known, watch.prior, watch.likelyNoise));
  const rates = past.tracks.filter(isMaybeSwitch).map((t) => {
    const gapDays = seen[t.bestGap]!.tDays - seen[t.bestGap - 1]!.tDays;
    return Math.min(0, Math.log((RATE_PER_YEAR[t.kind] * gapDays) / DAYS_PER_YEAR));
  });
  return (
    steadyEvidence(watch, noise, past) +
    logNoisePrior(noise, watch.prior, medianSigma(counted)) +
    rates.reduce((sum, rate) => sum + rate, 0)
  );
}

type BelievedChains = SwitchChains & { readonly kept: readonly Track[] };

/** With the glitches believed so far, or with switches in their stead; with the count lost, or kept after all. */
function bestChains(
  watch: PulsarWatch,
  past: Omit<Past, 'tracks'>,
  others: readonly Track[],
  sigmaTurns: number,
): { readonly many: BelievedChains; readonly few: BelievedChains } {
  const withGlitches = others.filter((t) => t.kind !== 'spin-down-rate change');
  const without = withGlitches.filter((t) => t.kind !== 'glitch');
  const counted = without.filter((t) => t.kind !== 'lost count');
  const kept = [withGlitches, without, counted].filter((some, i, all) => some.length !== all[i - 1]?.length);
  const found = kept.flatMap((tracks) =>
    QUIET_FREQUENCY.map((z) => {
      const noise = asFixed(watch.model, quiet(watch.likelyNoise, watch.prior, z));
      const prior = logNoisePrior(noise, watch.prior, sigmaTurns);
      const weighed = (chains: SwitchChains): BelievedChains => ({
        ...chains,
        kept: tracks,
        logEvidence: chains.logEvidence + prior,
      });
      const { many, few } = switchChains(watch, noise, { ...past, tracks });
      return { many: weighed(many), few: weighed(few) };
    }),
  );
  const best = (a: BelievedChains, b: BelievedChains) => (b.logEvidence > a.logEvidence ? b : a);
  return { many: found.map(({ many }) => many).reduce(best), few: found.map(({ few }) => few).reduce(best) };
}

/** Two switches within weeks, to a quicker rotation and back to the old rate: ν has risen slowly. */
function seeRise(watch: PulsarWatch, index: number, few: BelievedChains, steady: number): boolean {
  const [first, last] = few.switches;
  if (few.switches.length !== 2 || few.stepTurns >= 0) return false;
  const { seen } = watch.line;
  const days = seen[last!]!.tDays - seen[first!]!.tDays;
  const gaps = few.switches.map(
    (gap) => ((seen[gap]!.tDays - seen[gap - 1]!.tDays) * SWITCHES_PER_YEAR) / DAYS_PER_YEAR,
  );
  const logOdds = few.logEvidence - steady + LOG_RISE_PRIOR - gaps.reduce((sum, rate) => sum + Math.log(rate), 0);
  if (days > LONGEST_RISE_DAYS || logOdds < watch.settings.confirmLogOdds) return false;
  const near = (t: Track) => t.bestGap >= first! - NEAR_GAPS && t.bestGap <= last! + NEAR_GAPS;
  const taken = watch.tracks.filter(
    (t) => near(t) && isMaybeSwitch(t) && t.state !== 'withdrawn' && !few.kept.includes(t),
  );
  if (taken.some((t) => slowRise(t) !== null)) return false;
  const host = taken.find((t) => t.state === 'confirmed' && t.partOf === null) ?? newTrack(watch, index);
  for (const t of taken) if (t !== host) Object.assign(t, { state: 'withdrawn', settled: true });
  findCount(watch, few);
  settle(host, first!, index, logOdds);
  host.kind = 'glitch';
  host.shapes = {
    shares: { 'slow spin-up': 1 / (1 + Math.exp(-logOdds)) },
    firstGap: Math.max(2, first! - NEAR_GAPS),
    lastGap: Math.min(index, first! + NEAR_GAPS),
    rise: { firstGap: first!, lastGap: last!, days, stepTurns: -few.stepTurns },
  };
  watch.oldestGap = Math.max(watch.oldestGap, last! + 1);
  return true;
}

function quiet(noise: NoiseModel, { frequencyWalk, torqueWalk }: NoisePrior, z: number): NoiseModel {
  return {
    ...noise,
    frequencyWalk: frequencyWalk.median * Math.exp(z * frequencyWalk.lnScatter),
    torqueWalk: torqueWalk.median * Math.exp(QUIET_TORQUE * torqueWalk.lnScatter),
  };
}

/** One record, with a part for each switch; what was taken for other events is part of it. */
function adopt(watch: PulsarWatch, index: number, chain: BelievedChains, logOdds: number): void {
  const { seen } = watch.line;
  const known = switchingRecord(watch);
  const mistaken = watch.tracks.filter(
    (t) => t.state === 'confirmed' && isMaybeSwitch(t) && !chain.kept.includes(t) && t !== known,
  );
  const host = known ?? mistaken.find((t) => t.partOf === null) ?? newTrack(watch, index);
  const parts = mistaken.filter((t) => t !== host);
  for (const t of watch.tracks)
    if (
      t.state === 'suspected' &&
      isMaybeSwitch(t) &&
      chain.switches.some((gap) => Math.abs(gap - t.bestGap) <= NEAR_GAPS)
    )
      Object.assign(t, { state: 'withdrawn', settled: true });
  const [first, ...later] = chain.switches;
  const days = seen[chain.switches.at(-1)!]!.tDays - seen[first!]!.tDays;
  const modes: Modes = {
    stepTurns: Math.abs(chain.stepTurns),
    switchesPerYear: ((chain.switches.length - 1) * DAYS_PER_YEAR) / days,
    share: 1 / (1 + Math.exp(-logOdds)),
  };
  settle(host, first!, index, logOdds);
  Object.assign(host, { modes, partOf: null });
  for (const gap of later) {
    const part = parts.shift() ?? newTrack(watch, index);
    settle(part, gap, index, logOdds);
    Object.assign(part, { modes: null, partOf: host.number });
  }
  findCount(watch, chain);
  for (const t of parts) Object.assign(t, { state: 'withdrawn', partOf: host.number, modes: null, settled: true });
  watch.oldestGap = Math.max(watch.oldestGap, chain.switches.at(-1)! + 1);
}

/** The count that was thought lost fits what is believed now. */
function findCount(watch: PulsarWatch, { kept }: BelievedChains): void {
  for (const t of watch.tracks)
    if (t.kind === 'lost count' && t.state === 'confirmed' && !kept.includes(t)) t.state = 'withdrawn';
}

function settle(track: Track, gap: number, index: number, logOdds: number): void {
  Object.assign(track, {
    kind: 'spin-down-rate change',
    state: 'confirmed',
    bestGap: gap,
    firstGap: Math.max(1, gap - 1),
    lastGap: Math.min(index, gap + 1),
    confirmedAt: track.confirmedAt ?? index,
    logOdds,
    explanations: { 'spin-down-rate change': 1 },
    shapes: null,
    settled: true,
  } satisfies Partial<Track>);
}
