// What the second weighing should ask for:  npx tsx test/studies/secondWeighing.ts [SEED] [QUIET PULSARS] [GLITCHES PER CELL]
// The odds of a glitch by the noise learned before it (most probable, or a standard deviation louder) and jointly with the noise, for
// short and long histories. For each rule: false alarms a year on pulsars of the population, by importance sampling (Pollak 1987, Ann.
// Statist. 15, 749), and the delay over that of the clairvoyant test. Writes what it found beside itself.
import { writeFileSync } from 'node:fs';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { GLITCH_RATE_SIZE, GLITCH_SIZES, RATE_PER_YEAR } from '../../detectors/steps/births.ts';
import { alarmAt, innovationsOf, whitening } from '../support/clairvoyant.ts';
import {
  AHEAD,
  CADENCES,
  clairvoyantTest,
  drawn,
  EXPECTED,
  GAPS,
  MOST_SPREAD_TURNS,
  NOISES,
  seeded,
} from '../support/detectionTrial.ts';
import { type Odds, oddsOf, weigh } from '../support/marginalOdds.ts';
import { type Dice, simulateWalk } from '../support/simulatedPulsar.ts';

const seed = Number(process.argv[2] ?? 2026);
const quietPulsars = Number(process.argv[3] ?? 400);
const perCell = Number(process.argv[4] ?? 1);
const HISTORIES = [100, 200, 400];
const QUIET_ARRIVALS = 60;
const STRIDE = 7919;
/** Of the clairvoyant test: about that of the detector. */
const FALSE_ALARMS_PER_YEAR = 2e-5;
/** σ of ln of the walks' strength about the population law (Shannon & Cordes 2010, ApJ 725, 1607). */
const POPULATION_SCATTER = 3.2;
const SECONDS_PER_DAY = 86_400;
const DAYS_PER_YEAR = 365.25;

/** Odds by the noise learned before, and jointly: both must pass. */
interface Rule {
  readonly noise: 'likely' | 'louder';
  readonly odds: number;
  readonly joint: number;
}
const RULES: readonly Rule[] = (['likely', 'louder'] as const).flatMap((noise) =>
  [6, 2, 0, -1, -2, -4, -6, -99].map((joint) => ({ noise, odds: 6, joint })),
);

/** Index of the arrival at which a rule is first passed; −1: never. */
function passedAt({ noise, odds, joint }: Rule, found: Odds): number {
  return found.joint.findIndex((j, i) => j >= joint && found[noise][i]! >= odds);
}

interface Quiet {
  readonly years: number;
  /** Likelihood ratio of a step against none by the true noise, by arrival. */
  readonly ratios: readonly number[];
  readonly odds: Odds;
}

/** Every other one has a glitch, and counts for less by what it is likelier with one. */
function quietPulsar(n: number, history: number, random: Dice): Quiet {
  for (;;) {
    const frequencyHz = 10 ** (-0.5 + 1.8 * random.uniform());
    const sigmaTurns = 10 ** (1.3 + 1.7 * random.uniform()) * 1e-6 * frequencyHz;
    const frequencyDerivativeHzPerS = -(10 ** (-15.5 + 3 * random.uniform()));
    const prior = noisePrior(frequencyHz, frequencyDerivativeHzPerS);
    const strength = (median: number) => median * Math.exp(POPULATION_SCATTER * random.normal());
    const walks = {
      phaseWalk: 0,
      frequencyWalk: strength(prior.frequencyWalk.median),
      torqueWalk: strength(prior.torqueWalk.median),
    };
    const days = [0];
    while (days.length < history + QUIET_ARRIVALS)
      days.push(days.at(-1)! + GAPS[CADENCES[n % CADENCES.length]!]!(random));
    const law = whitening({ days, walks, sigmaTurns });
    if (law.variances.slice(history / 2).some((variance) => variance > MOST_SPREAD_TURNS ** 2)) continue;
    const begin = days[history - 1]!;
    const spanDays = days.at(-1)! - begin;
    const epoch = begin + spanDays * random.uniform();
    const size = drawnSize(random);
    const struck = Math.floor(n / CADENCES.length) % 2 === 1;
    const rate = struck ? -size * frequencyHz * SECONDS_PER_DAY * random.normal() : 0;
    const second = struck
      ? GLITCH_RATE_SIZE * Math.abs(frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2 * random.normal()
      : 0;
    const since = (day: number) => Math.max(0, day - epoch);
    const deviations = simulateWalk(days, walks, random).map(
      (turns, i) => turns + rate * since(days[i]!) + (second / 2) * since(days[i]!) ** 2 + sigmaTurns * random.normal(),
    );
    const pulsar = { days, deviations, sigmaTurns, frequencyHz, frequencyDerivativeHzPerS };
    const truth = weigh(pulsar, { ...walks, uncertaintyScale: 1, floorTurns: 0 }, history, history);
    const ratios = days.slice(history).map((day, i) => {
      const soFar = (Math.exp(truth.logOdds[history + i]!) / RATE_PER_YEAR.glitch) * DAYS_PER_YEAR;
      return (soFar + days.at(-1)! - day) / spanDays;
    });
    return { years: spanDays / DAYS_PER_YEAR, ratios, odds: oddsOf(pulsar, history) };
  }
}

function drawnSize(random: Dice): number {
  let left = random.uniform();
  for (const [share, size] of GLITCH_SIZES) {
    left -= share;
    if (left < 0) return size;
  }
  return GLITCH_SIZES.at(-1)![1];
}

interface Struck {
  readonly clairvoyant: number;
  readonly odds: Odds;
}

/** A glitch of the size that the clairvoyant test needs about so many arrivals for. */
function struckPulsar(cell: Parameters<typeof drawn>[0], random: Dice): Struck {
  for (;;) {
    const pulsar = drawn(cell, random);
    const test = clairvoyantTest(pulsar, cell.expected, FALSE_ALARMS_PER_YEAR, random);
    if (test === null) continue;
    const { days, before, law, walks, uncertaintyUs, model } = pulsar;
    const frequencyHz = model.spin.frequencyHz.hi;
    const sigmaTurns = uncertaintyUs * 1e-6 * frequencyHz;
    const epoch = days[before - 1]! + random.uniform() * (days[before]! - days[before - 1]!);
    const quiet = simulateWalk(days, walks, random).map((turns) => turns + sigmaTurns * random.normal());
    const late = days.map((day) => -test.deltaNuHz * SECONDS_PER_DAY * Math.max(0, day - epoch));
    const deviations = quiet.map((turns, i) => turns + late[i]!);
    const alarm = alarmAt(law, innovationsOf(law, quiet, late), test);
    if (alarm !== null && alarm < before) continue;
    const { frequencyDerivativeHzPerS } = model.spin;
    return {
      clairvoyant: alarm === null ? AHEAD : alarm - before + 1,
      odds: oddsOf({ days, deviations, sigmaTurns, frequencyHz, frequencyDerivativeHzPerS }, before),
    };
  }
}

function judged(rule: Rule, quiet: readonly Quiet[], struck: readonly Struck[]) {
  const years = quiet.reduce((sum, q) => sum + q.years, 0);
  const weights = quiet.map((q) => {
    const at = passedAt(rule, q.odds);
    return at < 0 ? 0 : 1 / (0.5 + 0.5 * q.ratios[at]!);
  });
  const delays = struck.map(({ odds }) => passedAt(rule, odds) + 1 || AHEAD);
  const total = (numbers: readonly number[]) => numbers.reduce((sum, x) => sum + x, 0);
  const ratios = struck.map(({ clairvoyant }, k) => delays[k]! / clairvoyant).sort((a, b) => a - b);
  const rounded = (x: number) => Number(x.toPrecision(2));
  return {
    ...rule,
    falseAlarmsPerYear: rounded(total(weights) / years),
    standardError: rounded(Math.sqrt(total(weights.map((w) => w * w))) / years),
    delayOverClairvoyant: rounded(total(delays) / total(struck.map((s) => s.clairvoyant))),
    medianRatio: rounded(ratios[ratios.length >> 1]!),
    missed: delays.filter((d) => d === AHEAD).length,
  };
}

const histories = HISTORIES.map((history, k) => {
  const random = seeded(seed + k);
  const quiet = Array.from({ length: quietPulsars }, (_, n) => quietPulsar(n, history, random));
  const cells = CADENCES.flatMap((cadence) =>
    NOISES.flatMap((noise) => EXPECTED.map((expected) => ({ history, cadence, noise, expected }))),
  );
  const struck = cells.flatMap((cell, n) =>
    Array.from({ length: perCell }, (_, m) => struckPulsar(cell, seeded(seed + STRIDE * (n * perCell + m)))),
  );
  const years = Math.round(quiet.reduce((sum, q) => sum + q.years, 0));
  return { history, years, glitches: struck.length, rules: RULES.map((rule) => judged(rule, quiet, struck)) };
});
const result = { date: new Date().toISOString().slice(0, 10), seed, quietPulsars, histories };
writeFileSync(new URL('secondWeighing.json', import.meta.url), `${JSON.stringify(result, null, 1)}\n`);
for (const { history, rules } of histories) {
  console.log(`about ${history} arrivals before`);
  console.table(rules);
}
