/**
 * How often noise alone would take a pulsar's odds over a level: the tail of its null.
 *
 * The noise that decides was learned, and may be wrong: each simulated pulsar draws its own, from what was learned and
 * how well, and is judged by a bank that was told the learned one. False alerts are rare. So half of the simulated
 * pulsars have a true step, drawn by rate and size from the prior, and count for less (importance sampling of a
 * sequential test: Siegmund 1976, Ann. Statist. 4, 673; Pollak 1987, Ann. Statist. 15, 749, for odds summed over gaps).
 * With Λ the likelihood ratio of the arrivals, a step somewhere against none, by the true noise, a crossing has the
 * weight 1 / (½ + ½ Λ): at most 2.
 *
 * If the noise were known, no more than λ e^(−level) a year could cross (Ville 1939, Étude critique de la notion de
 * collectif): the tail falls with a slope of 1 or more beyond the levels that are sampled.
 */

import type { NoiseModel } from '../report.ts';
import type { Bank } from '../steps/bank.ts';
import { born, KINDS, RATE_PER_YEAR } from '../steps/births.ts';
import { isExplained, sessionsUsed, spreadOf, weigh } from '../steps/evidence.ts';
import { zeros } from '../steps/hypothesis.ts';
import { birthPlace } from '../steps/places.ts';
import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { TOTAL_RATE } from '../steps/threshold.ts';
import type { Seen } from '../steps/timeline.ts';
import { type RandomStream, randomStream } from './randomStream.ts';
import { type PlannedStep, RECENT_ARRIVALS, type RehearsedPulsar, recentCadence, rehearse } from './rehearsedPulsar.ts';

/** Natural-log odds at which the tail is sampled. */
const LEVELS = [3, 4, 5, 6, 7, 8, 9, 10];
const DAYS_PER_YEAR = 365.25;
const PULSARS = 120;
const ARRIVALS = 60;

/** What a step must pass besides the threshold. */
export interface Demands {
  /** Of the second weighing, to leave the decision to the first; infinite where both must pass. */
  readonly leastJointOdds: number;
  readonly sessions: number;
}

/** False alerts per year at each level, of this pulsar alone. */
export interface NullTail {
  readonly levels: readonly number[];
  readonly perYear: readonly number[];
}

export function nullTail(watch: PulsarWatch, demands: Demands, pulsars = PULSARS): NullTail {
  const random = randomStream(seedOf(watch));
  const perYear = LEVELS.map(() => 0);
  for (let n = 0; n < pulsars; n++) {
    const cadence = recentCadence(watch, ARRIVALS, random);
    const step = n % 2 === 0 ? null : plannedStep(watch, cadence, random);
    const years = cadence.at(-1)!.tDays / DAYS_PER_YEAR;
    const truth = drawnNoise(watch, random);
    const pulsar = rehearse(watch, cadence, truth.noise, step, random);
    crossings(pulsar, truth.logPrior, years, demands).forEach((ratio, k) => {
      if (ratio !== null) perYear[k]! += 1 / (pulsars * years * (0.5 + 0.5 * ratio));
    });
  }
  return { levels: LEVELS, perYear };
}

/** Everything that the tail depends on: the same pulsar, noise and cadence give the same tail. */
function seedOf({ model, noise, likelyNoise, line }: PulsarWatch): string {
  const cadence = line.seen.slice(-RECENT_ARRIVALS).map(({ tDays, sigmaTurns }) => [tDays, sigmaTurns]);
  return JSON.stringify([model.name, noise, likelyNoise, cadence]);
}

/** A kind and a size by their rates, in a gap by its length. */
function plannedStep(watch: PulsarWatch, cadence: readonly Seen[], random: RandomStream): PlannedStep {
  const epoch = random.uniform() * cadence.at(-1)!.tDays;
  const beforeIndex = cadence.findIndex(({ tDays }) => tDays > epoch);
  const gapDays = cadence[beforeIndex]!.tDays - cadence[beforeIndex - 1]!.tDays;
  const { size } = watch.states;
  const sure = { ...watch.bank!.beam[0]!, mean: zeros(size), cov: zeros(size * size), logWeight: 0 };
  const kind = byWeight(KINDS, (k) => RATE_PER_YEAR[k], random);
  const place = { ...birthPlace(watch, watch.line.seen.length - 1, gapDays), countKnown: true };
  const children = born(kind, sure, place);
  // Without a second band there is no step of the dispersion: the pulsar stays as it was.
  const { cov } = children.length === 0 ? sure : byWeight(children, (child) => Math.exp(child.logWeight), random);
  return { beforeIndex, covariance: cov };
}

function byWeight<T>(choices: readonly T[], weightOf: (choice: T) => number, random: RandomStream): T {
  let left = random.uniform() * choices.reduce((sum, choice) => sum + weightOf(choice), 0);
  for (const choice of choices) {
    left -= weightOf(choice);
    if (left < 0) return choice;
  }
  return choices.at(-1)!;
}

/** What decides is one standard deviation louder than the most probable: in the walks, and in the errors. */
const LOG_PRIOR_TOLD = -1;

/** A noise that may be the true one: around the most probable, with the margin for its standard deviation. */
function drawnNoise(
  { noise, likelyNoise }: PulsarWatch,
  random: RandomStream,
): { readonly noise: NoiseModel; readonly logPrior: number } {
  const [forWalks, forErrors] = [random.normal(), random.normal()];
  const ratio = (louder: number, likely: number) => (likely > 0 ? louder / likely : 1);
  const walks = ratio(noise.frequencyWalk, likelyNoise.frequencyWalk) ** forWalks;
  const errors = ratio(noise.uncertaintyScale, likelyNoise.uncertaintyScale) ** forErrors;
  return {
    noise: {
      phaseWalk: likelyNoise.phaseWalk,
      frequencyWalk: likelyNoise.frequencyWalk * walks,
      torqueWalk: likelyNoise.torqueWalk * walks,
      uncertaintyScale: likelyNoise.uncertaintyScale * errors,
      floorTurns: likelyNoise.floorTurns * errors,
    },
    logPrior: -0.5 * (forWalks ** 2 + forErrors ** 2),
  };
}

/** By level, at the arrival that would confirm: Λ by the true noise (a step yet to come counts as 1); null if none does. */
function crossings(
  { knowing, deciding, next }: RehearsedPulsar,
  logPriorTrue: number,
  years: number,
  { leastJointOdds, sessions }: Demands,
): readonly (number | null)[] {
  const found: (number | null)[] = LEVELS.map(() => null);
  for (let n = 1; n < ARRIVALS; n++) {
    next();
    const first = confirmableOdds(deciding, sessions);
    if (first < LEVELS[0]!) continue;
    const second = secondWeighing(deciding.bank!, knowing.bank!, logPriorTrue);
    const odds = second >= leastJointOdds ? first : Math.min(first, second);
    const { something, nothing } = weigh(knowing.bank!);
    const yearsLeft = years - deciding.line.seen.at(-1)!.tDays / DAYS_PER_YEAR;
    const ratio = (Math.exp(something - nothing) / TOTAL_RATE + yearsLeft) / years;
    LEVELS.forEach((level, k) => {
      if (odds >= level && found[k] === null) found[k] = ratio;
    });
    if (odds >= LEVELS.at(-1)!) break;
  }
  return found;
}

/** Natural-log odds of the strongest kind, where it passes everything but the threshold; −∞ where it does not. */
function confirmableOdds({ bank, line }: PulsarWatch, sessions: number): number {
  const evidence = weigh(bank!);
  const { strongest, byKind, nothing } = evidence;
  if (strongest === null || !isExplained(evidence, strongest)) return -Infinity;
  const weight = byKind.get(strongest)!;
  const gap = spreadOf(bank!, strongest).bestGap;
  const { beam } = bank!.families.find((f) => f.kind === strongest && f.gap === gap)!;
  const holder = beam.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  return sessionsUsed(holder, gap, (i) => line.seen[i]!.session) < sessions ? -Infinity : weight - nothing;
}

/**
 * Each side with the noise that suits it better, the one told or the true one: what `steps/jointOdds.ts` does over all
 * noise models.
 */
function secondWeighing(told: Bank, known: Bank, logPriorTrue: number): number {
  const kind = weigh(told).strongest!;
  const eventOf = (bank: Bank) => bank.logScale + (weigh(bank).byKind.get(kind) ?? -Infinity);
  const nothingOf = (bank: Bank) => bank.logScale + weigh(bank).nothing;
  const best = (side: (bank: Bank) => number) => Math.max(side(told) + LOG_PRIOR_TOLD, side(known) + logPriorTrue);
  return best(eventOf) - best(nothingOf);
}

/** Natural-log odds from which false alerts stay below a rate per year. Beyond the last level the slope is 1. */
export function levelFor({ levels, perYear }: NullTail, ratePerYear: number): number {
  const last = levels.length - 1;
  const beyond = levels[last]! + Math.log(Math.max(perYear[last]! / ratePerYear, 1));
  for (let k = last; k >= 0; k--) {
    if (perYear[k]! <= ratePerYear) continue;
    if (k === last) return beyond;
    const above = perYear[k + 1]!;
    // Nothing sampled above: the slope is 1 there too.
    const slope = above > 0 ? Math.log(perYear[k]! / above) / (levels[k + 1]! - levels[k]!) : 1;
    return Math.min(levels[k + 1]!, levels[k]! + Math.log(perYear[k]! / ratePerYear) / Math.max(slope, 1e-6));
  }
  return levels[0]!;
}

/** False alerts per year at these odds: the tail between its levels, slope 1 beyond them and below. */
export function rateAt({ levels, perYear }: NullTail, logOdds: number): number {
  const k = levels.findLastIndex((level) => level <= logOdds);
  if (k < 0) return perYear[0]! * Math.exp(levels[0]! - logOdds);
  const above = perYear[k + 1];
  if (above === undefined || above <= 0) return perYear[k]! * Math.exp(levels[k]! - logOdds);
  const share = (logOdds - levels[k]!) / (levels[k + 1]! - levels[k]!);
  return perYear[k]! ** (1 - share) * above ** share;
}
