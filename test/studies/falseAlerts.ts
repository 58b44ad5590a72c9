// False alerts against the operator's budget:  npx tsx test/studies/falseAlerts.ts [SEED] [PULSARS] [LOG_ODDS]
// Pulsars that never glitch: white noise, walks in frequency or torque as strong as the population law draws them, seen daily, every
// third day, weekly or irregularly; the noise is learned as the arrivals come. Everything that was ever confirmed counts, as it was
// mailed. LOG_ODDS: the least odds, for a look at the tail. Writes what it found beside itself, a run after the other.
import { existsSync, readFileSync, writeFileSync } from 'node:fs';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { TOTAL_RATE } from '../../detectors/steps/threshold.ts';
import { type Dice, dice, observingDays } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../support/simulatedWatch.ts';

const seed = Number(process.argv[2] ?? 1);
const pulsars = Number(process.argv[3] ?? 300);
const leastLogOdds = process.argv[4] === undefined ? undefined : Number(process.argv[4]);
const BUDGET_PER_YEAR = 1;
const PROGRAMME = 500;
const WARM_UP = 20;
/** Primes apart, so that neighbouring pulsars do not begin alike. */
const STRIDE = 7919;
const CADENCES = [
  { name: 'daily', days: 1, jitter: 0.5, count: 200 },
  { name: '3 days', days: 3, jitter: 0.5, count: 200 },
  { name: 'weekly', days: 7, jitter: 0.6, count: 150 },
  { name: 'irregular', days: 20, jitter: 1, count: 120 },
];
const NOISES = ['white', 'frequency walk', 'torque walk'];

interface Followed {
  readonly what: string;
  readonly years: number;
  /** Explanations of all that was ever confirmed, and how many were withdrawn again. */
  readonly confirmed: readonly string[];
  readonly withdrawn: number;
  readonly suspectedUp: number;
  readonly suspectedDown: number;
}

function follow(n: number, random: Dice): Followed {
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  const cadence = CADENCES[n % CADENCES.length]!;
  const noise = NOISES[Math.floor(n / CADENCES.length) % NOISES.length]!;
  const frequencyHz = 10 ** (-0.5 + 1.8 * random.uniform());
  const uncertaintyUs = 10 ** (1.3 + 1.7 * random.uniform());
  const frequencyDerivativeHzPerS = -(10 ** (-15.5 + 3 * random.uniform()));
  const model = modelOf({ frequencyHz: frequencyHz.toFixed(12), frequencyDerivativeHzPerS, epochMjd: 58_000 });
  const prior = noisePrior(frequencyHz, frequencyDerivativeHzPerS);
  const strength = ({ median, lnScatter }: typeof prior.phaseWalk) => median * Math.exp(lnScatter * random.normal());
  const walks = {
    phaseWalk: 0,
    frequencyWalk: noise === 'frequency walk' ? strength(prior.frequencyWalk) : 0,
    torqueWalk: noise === 'torque walk' ? strength(prior.torqueWalk) : 0,
  };
  const days = observingDays(cadence.count, cadence.days, cadence.jitter, random).sort((a, b) => a - b);
  const settings = detectorSettings(BUDGET_PER_YEAR, PROGRAMME);
  const watch = startWatch(model, { ...settings, confirmLogOdds: leastLogOdds ?? settings.confirmLogOdds });
  for (const arrival of simulateTimedArrivals(model, { days, walks, uncertaintyUs }, random)) advance(watch, arrival);
  const { events } = report(watch);
  const alerts = events.filter((e) => e.confirmedAtMjd !== null && e.explanation !== 'bad session');
  const suspected = events.filter((e) => e.deltaNuHz !== null);
  return {
    what: `${noise}, ${cadence.name}`,
    years: (days.at(-1)! - days[0]!) / 365.25,
    confirmed: alerts.map((e) => e.explanation),
    withdrawn: alerts.filter((e) => e.state === 'withdrawn').length,
    suspectedUp: suspected.filter((e) => e.deltaNuHz! > 0).length,
    suspectedDown: suspected.filter((e) => e.deltaNuHz! < 0).length,
  };
}

const found = Array.from({ length: pulsars }, (_, n) => follow(n, dice(seed + n * STRIDE)));
const sum = (of: (f: Followed) => number) => found.reduce((total, f) => total + of(f), 0);
const years = sum((f) => f.years);
const alerts = sum((f) => f.confirmed.length);
const tally = (names: readonly string[]) => {
  const counts: Record<string, number> = {};
  for (const name of names) counts[name] = (counts[name] ?? 0) + 1;
  return counts;
};
const settings = detectorSettings(BUDGET_PER_YEAR, PROGRAMME);
const leastOdds = leastLogOdds ?? settings.confirmLogOdds;
const result = {
  date: new Date().toISOString().slice(0, 10),
  seed,
  pulsars,
  pulsarYears: Math.round(years),
  leastLogOdds: leastOdds,
  alerts,
  withdrawnAgain: sum((f) => f.withdrawn),
  overBudget: Number((alerts / (settings.falseAlertsPerYear * years)).toFixed(3)),
  overVillesBound: Number((alerts / (TOTAL_RATE * Math.exp(-leastOdds) * years)).toFixed(2)),
  byExplanation: tally(found.flatMap((f) => f.confirmed)),
  byNoiseAndCadence: tally(found.flatMap((f) => f.confirmed.map(() => f.what))),
  suspectedUp: sum((f) => f.suspectedUp),
  suspectedDown: sum((f) => f.suspectedDown),
};
const file = new URL('falseAlerts.json', import.meta.url);
const before: unknown[] = existsSync(file) ? JSON.parse(readFileSync(file, 'utf8')) : [];
writeFileSync(file, `${JSON.stringify([...before, result], null, 2)}\n`);
console.log(result);
