/** One simulated pulsar with one glitch: how long the detector took to confirm it, and how long the clairvoyant test did. */
import type { TimedArrival } from '../../detectors/arrival.ts';
import { type LogNormal, noisePrior } from '../../detectors/filter/noisePrior.ts';
import { advance, detectorSettings, startWatch } from '../../detectors/index.ts';
import { nullTail, rateAt } from '../../detectors/nulls/nullTail.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { LEAST_SESSIONS } from '../../detectors/steps/decide.ts';
import { isExplained, weigh } from '../../detectors/steps/evidence.ts';
import { leastJointOdds } from '../../detectors/steps/jointOdds.ts';
import type { PulsarWatch } from '../../detectors/steps/pulsarWatch.ts';
import { addSeconds } from '../../detectors/time/mjd.ts';
import { alarmAt, arrivalsUntil, innovationsOf, thresholdFor, type Whitening, whitening } from './clairvoyant.ts';
import { type Dice, dice } from './simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from './simulatedWatch.ts';

const jittered =
  (days: number) =>
  ({ uniform }: Dice): number =>
    days * (1 + 0.2 * (uniform() - uniform()));
/** Days from one arrival to the next. */
export const GAPS: Readonly<Record<string, (random: Dice) => number>> = {
  daily: jittered(1),
  '3-day': jittered(3),
  weekly: jittered(7),
  irregular: ({ uniform }) => 0.5 - 10 * Math.log(1 - uniform()),
};
export const CADENCES = Object.keys(GAPS);
export const NOISES = ['white', 'frequency walk', 'torque walk'] as const;
/** Arrivals that the clairvoyant test is expected to need: this sets the size of the glitch. */
export const EXPECTED = [3, 8, 20] as const;

/** Arrivals before the glitch, about: a new pulsar, and one followed for years. The noise is learned from them. */
export const HISTORIES = [100, 400] as const;
const HISTORY_SPREAD = 0.2;
/** Alarms of the clairvoyant test count from so many arrivals before the glitch on. */
const ARRIVALS_ON_GUARD = 50;
/** Arrivals after the glitch; one that is not confirmed by then counts with as many. */
export const AHEAD = 100;
/** Sizes of published glitches, relative; beyond the largest the count of turns is lost, which is another study. */
const SIZES = [3e-11, 1e-6] as const;
const BUDGET_PER_YEAR = 1;
const PROGRAMME = 500;
const WARM_UP = 20;
const ROUNDS = 2;
const CLAIRVOYANT_PROGRAMMES = 60;
const FIRST_NATS = 12;
/** A walk hides a step again: where all arrivals together are expected to tell no more than so many thresholds, there is no delay. */
const SURE = 2;
/** Where noise spreads the next arrival further than this, turns, the count of turns is lost: another study. */
export const MOST_SPREAD_TURNS = 0.05;

/** The size is that of the glitch: how many arrivals the clairvoyant test is expected to need. */
export interface Cell {
  readonly history: number;
  readonly cadence: string;
  readonly noise: (typeof NOISES)[number];
  readonly expected: number;
}

/** Arrivals from the first after the glitch to the deciding one, both counted; null: within `AHEAD`, never. */
export interface Trial extends Cell {
  readonly size: number;
  readonly clairvoyant: number | null;
  readonly confirmed: number | null;
  /** The odds alone have passed the threshold; and the share of the explanation as well. */
  readonly oddsPassed: number | null;
  readonly explained: number | null;
  /** Something was confirmed, or the clairvoyant test alarmed, before the glitch: not counted. */
  readonly early: boolean;
}

interface Pulsar {
  readonly model: PulsarModel;
  readonly uncertaintyUs: number;
  readonly walks: { readonly phaseWalk: number; readonly frequencyWalk: number; readonly torqueWalk: number };
  readonly days: readonly number[];
  readonly before: number;
  readonly law: Whitening;
}

export function detectionTrial(seed: number, cell: Cell, falseAlarmsPerYear: number): Trial {
  const random = seeded(seed);
  for (;;) {
    const pulsar = drawn(cell, random);
    const test = clairvoyantTest(pulsar, cell.expected, falseAlarmsPerYear, random);
    // The size would lie beyond those of real glitches: another pulsar is drawn.
    if (test !== null) return followed(cell, pulsar, test, random);
  }
}

/**
 * False alarms a year of the detector at its threshold, on simulated pulsars of the noise and cadence that it has learned of a
 * pulsar of this cell: what the programme itself goes by.
 */
export function falseAlarmRate(seed: number, cell: Cell, simulated: number): number {
  const random = seeded(seed);
  const pulsar = drawn(cell, random);
  const watch = watchedUntil(pulsar, quietArrivals(pulsar, random));
  const least = leastJointOdds(watch, { kind: 'glitch', bestGap: pulsar.before });
  const tail = nullTail(watch, { leastJointOdds: least, sessions: LEAST_SESSIONS }, simulated);
  return rateAt(tail, watch.settings.confirmLogOdds);
}

export function seeded(seed: number): Dice {
  const random = dice(seed);
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  return random;
}

/** As strong a walk as the population law draws it. */
export function drawn({ history, cadence, noise }: Cell, random: Dice): Pulsar {
  const frequencyHz = 10 ** (-0.5 + 1.8 * random.uniform());
  const uncertaintyUs = 10 ** (1.3 + 1.7 * random.uniform());
  const frequencyDerivativeHzPerS = -(10 ** (-15.5 + 3 * random.uniform()));
  const prior = noisePrior(frequencyHz, frequencyDerivativeHzPerS);
  const strength = ({ median, lnScatter }: LogNormal) => median * Math.exp(lnScatter * random.normal());
  const walks = {
    phaseWalk: 0,
    frequencyWalk: noise === 'frequency walk' ? strength(prior.frequencyWalk) : 0,
    torqueWalk: noise === 'torque walk' ? strength(prior.torqueWalk) : 0,
  };
  const before = Math.round(history * (1 + HISTORY_SPREAD * (random.uniform() - 0.5)));
  const days = [0];
  while (days.length < before + AHEAD) days.push(days.at(-1)! + GAPS[cadence]!(random));
  const law = whitening({ days, walks, sigmaTurns: uncertaintyUs * 1e-6 * frequencyHz });
  const model = modelOf({ frequencyHz: frequencyHz.toFixed(12), frequencyDerivativeHzPerS, epochMjd: 58_000 });
  return { model, uncertaintyUs, walks, days, before, law };
}

interface KnownStep {
  readonly from: number;
  readonly deltaNuHz: number;
  readonly threshold: number;
}

/** The size that takes as many arrivals as expected, and the threshold for it; null where no glitch is of that size. */
export function clairvoyantTest(
  { law, before, model }: Pulsar,
  expected: number,
  perYear: number,
  random: Dice,
): KnownStep | null {
  const from = before - ARRIVALS_ON_GUARD;
  if (law.variances.slice(from).some((variance) => variance > MOST_SPREAD_TURNS ** 2)) return null;
  let threshold = FIRST_NATS;
  for (let round = 0; ; round++) {
    const deltaNuHz = sizeNeeded(
      (nu) => arrivalsUntil(law, before, nu, threshold),
      expected,
      model.spin.frequencyHz.hi,
    );
    if (deltaNuHz === null || arrivalsUntil(law, before, deltaNuHz, SURE * threshold) === Number.POSITIVE_INFINITY)
      return null;
    threshold = thresholdFor(law, { from, perYear, programmes: CLAIRVOYANT_PROGRAMMES, deltaNuHz }, random);
    if (round === ROUNDS) return { from, deltaNuHz, threshold };
  }
}

/** Bisection in the logarithm; null beyond the published sizes. */
function sizeNeeded(arrivalsFor: (nu: number) => number, expected: number, frequencyHz: number): number | null {
  let [low, high] = SIZES.map((size) => Math.log(size * frequencyHz)) as [number, number];
  if (arrivalsFor(Math.exp(low)) < expected || arrivalsFor(Math.exp(high)) > expected) return null;
  for (let i = 0; i < 30; i++) {
    const middle = (low + high) / 2;
    if (arrivalsFor(Math.exp(middle)) > expected) low = middle;
    else high = middle;
  }
  return Math.exp((low + high) / 2);
}

const quietArrivals = ({ model, days, walks, uncertaintyUs }: Pulsar, random: Dice) =>
  simulateTimedArrivals(model, { days, walks, uncertaintyUs }, random);

function watchedUntil({ model, before }: Pulsar, arrivals: readonly TimedArrival[]): PulsarWatch {
  const watch = startWatch(model, detectorSettings(BUDGET_PER_YEAR, PROGRAMME));
  for (const arrival of arrivals.slice(0, before)) advance(watch, arrival);
  return watch;
}

/** The same arrivals to both. */
function followed(cell: Cell, pulsar: Pulsar, test: KnownStep, random: Dice): Trial {
  const { days, before, law, model } = pulsar;
  const nu = model.spin.frequencyHz.hi;
  const epochDays = days[before - 1]! + random.uniform() * (days[before]! - days[before - 1]!);
  const glitch = spinUp(nu, epochDays, test.deltaNuHz / nu);
  const late = days.map((day, index) => glitch(day, { frequencyMhz: 1400, index }));
  const quiet = quietArrivals(pulsar, random);
  const watch = watchedUntil(pulsar, quiet);
  const early = watch.tracks.some((t) => t.confirmedAt !== null);
  const deviations = quiet.map(({ tdb }) => watch.phaseAt(tdb).deviationTurns);
  const alarm = alarmAt(law, innovationsOf(law, deviations, late), test);
  const seen: Seen = { confirmed: null, oddsPassed: null, explained: null };
  for (let i = before; i < days.length && seen.confirmed === null; i++) {
    advance(watch, { ...quiet[i]!, tdb: addSeconds(quiet[i]!.tdb, late[i]! / nu) });
    note(watch, i - before + 1, seen);
  }
  return {
    ...cell,
    size: test.deltaNuHz / nu,
    clairvoyant: alarm === null ? null : alarm - before + 1,
    ...seen,
    early: early || (alarm !== null && alarm < before),
  };
}

type Seen = { -readonly [K in 'confirmed' | 'oddsPassed' | 'explained']: number | null };

function note(watch: PulsarWatch, arrival: number, seen: Seen): void {
  if (watch.tracks.some((t) => t.confirmedAt !== null && t.kind === 'glitch')) {
    for (const what of ['confirmed', 'oddsPassed', 'explained'] as const) seen[what] ??= arrival;
    return;
  }
  const evidence = weigh(watch.bank!);
  const { byKind, nothing, strongest } = evidence;
  const weight = byKind.get('glitch') ?? -Infinity;
  if (weight - nothing + Math.LN2 < watch.settings.confirmLogOdds) return;
  seen.oddsPassed ??= arrival;
  if (strongest === 'glitch' && isExplained(evidence, 'glitch')) seen.explained ??= arrival;
}
