/**
 * Large glitches seen at the same sidereal time every day: is the true size among the listed sizes, and first once two
 * observations a few hours apart exist? The real detector decides: a glitch of 1e-7 to 3e-5 after 60 to 90 nights one
 * sidereal day apart, some nights missed, then up to 25 nights, and a second observation hours later on the last but one.
 * Run: npx tsx test/studies/aliases.ts [glitches]. Writes aliases.json beside itself.
 */
import { writeFileSync } from 'node:fs';
import { advance, detectorSettings, type PulsarEvent, report, startWatch } from '../../detectors/index.ts';
import { type Dice, dice } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from '../support/simulatedWatch.ts';

const SEED = 40_000;
const STRIDE = 7919;
const GLITCHES = Number(process.argv[2] ?? 500);
const EPOCH_MJD = 58_000;
/** IERS Conventions 2010. */
const SIDEREAL_DAY = 86_164.0905 / 86_400;
/** Of a turn a sidereal day: nearer than this to the truth is the true size. */
const CLOSE = 0.1;

interface Outcome {
  readonly size: number;
  readonly confirmed: boolean;
  readonly listed: boolean;
  readonly first: boolean;
  readonly firstAfterSecondLook: boolean;
}

function follow(random: Dice): Outcome {
  for (let i = 0; i < 20; i++) random.uniform();
  const frequencyHz = 10 ** (0 + 1.3 * random.uniform());
  const size = 1e-7 * 300 ** random.uniform();
  const model = modelOf({
    frequencyHz: frequencyHz.toFixed(12),
    frequencyDerivativeHzPerS: -(10 ** (-14 + 2 * random.uniform())),
    epochMjd: EPOCH_MJD,
  });
  const uncertaintyUs = 10 ** (1.5 + random.uniform());
  const wander = 0.1 * uncertaintyUs * 1e-6 * frequencyHz;
  const walks = { phaseWalk: 0, frequencyWalk: (3 * wander ** 2) / 30 ** 3, torqueWalk: 0 };
  const before = 60 + Math.floor(30 * random.uniform());
  const after = 12 + Math.floor(14 * random.uniform());
  const night = (n: number) => (n + 0.002 * (random.uniform() - 0.5)) * SIDEREAL_DAY;
  const nights = Array.from({ length: before + after }, (_, n) => n).filter(() => random.uniform() < 0.85);
  const days = nights.map(night);
  const epoch = (before - random.uniform()) * SIDEREAL_DAY;
  const secondLook = [days.at(-1)! + 3 / 24 + (2 / 24) * random.uniform(), days.at(-1)! + SIDEREAL_DAY];
  const happening = spinUp(frequencyHz, epoch, size);
  const watch = startWatch(model, detectorSettings(1, 100));
  const all = simulateTimedArrivals(model, { days: [...days, ...secondLook], walks, uncertaintyUs, happening }, random);
  const own = () =>
    report(watch).events.find((e) => e.explanation === 'glitch' && e.state === 'confirmed' && near(e, epoch));
  for (const arrival of all.slice(0, days.length)) advance(watch, arrival);
  const truth = size * frequencyHz;
  const daily = own();
  for (const arrival of all.slice(days.length)) advance(watch, arrival);
  const settled = own();
  const sizes = daily === undefined ? [] : [daily.deltaNuHz!, ...daily.aliases.map((a) => a.deltaNuHz)];
  return {
    size,
    confirmed: settled !== undefined,
    listed: sizes.some((s) => isTrue(s, truth)),
    first: daily !== undefined && isTrue(daily.deltaNuHz!, truth),
    firstAfterSecondLook: settled !== undefined && isTrue(settled.deltaNuHz!, truth),
  };
}

function near(event: PulsarEvent, epoch: number): boolean {
  return Math.abs(event.epochMjd - EPOCH_MJD - epoch) < 5;
}

function isTrue(found: number, truth: number): boolean {
  return Math.abs(found - truth) * 86_400 * SIDEREAL_DAY < CLOSE;
}

const outcomes = Array.from({ length: GLITCHES }, (_, n) => follow(dice(SEED + n * STRIDE)));
const percent = (of: (o: Outcome) => boolean) =>
  Number(((100 * outcomes.filter(of).length) / outcomes.length).toFixed(1));
const result = {
  date: new Date().toISOString().slice(0, 10),
  seed: SEED,
  glitches: outcomes.length,
  confirmedPercent: percent((o) => o.confirmed),
  trueSizeListedPercent: percent((o) => o.listed),
  trueSizeFirstOnDailyArrivalsPercent: percent((o) => o.first),
  trueSizeFirstAfterSecondLookPercent: percent((o) => o.firstAfterSecondLook),
};
if (GLITCHES >= 500) writeFileSync(new URL('aliases.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(result);
for (const o of outcomes.filter((x) => !x.listed || !x.firstAfterSecondLook)) console.log(JSON.stringify(o));
