/**
 * How well the clock of a site is watched. Thirty pulsars of 33 ms to 1.4 s, errors of 5 to 50 µs, are seen every 1 to 3 days for
 * 115 days; in one night the clock steps, or does not. Each pulsar is followed by itself, as the daemon does; then the clock is
 * judged from the first 3 of them, the first 6 and all 30: once as they are, once with the first pulsar glitching in that very night.
 * Counted: steps found, false steps, and the pull (found − true)/σ of the sizes.
 *
 * `npx tsx test/studies/siteSteps.ts [SITES [FILE]]` writes the result beside itself after every site. What takes long is to
 * follow the pulsars: FILE keeps that, one line a site, for when only the judging of clocks has changed.
 */
import { appendFileSync, existsSync, readFileSync, writeFileSync } from 'node:fs';
import {
  advance,
  detectorSettings,
  type PulsarTimes,
  pulsarTimes,
  siteSteps,
  startWatch,
} from '../../detectors/index.ts';
import {
  type FoldedPulsar,
  logUniform,
  pulsarOfSite,
  SITE_DAYS,
  SITE_EPOCH_MJD,
  type SiteTruth,
  STEP_DAY,
  warmDice,
} from '../support/simulatedSite.ts';

const SITES = Number(process.argv[2] ?? 96);
const KEPT_IN = process.argv[3] ?? null;
/** Of either sign; 0: the site is quiet. */
const SIZES_US = [0, 20, 50, 100, 200, 500, 2000, 50_000];
const COUNTS = [3, 6, 30];
const MOST = 30;
const SETTINGS = detectorSettings(1, MOST);
const STEP_MJD = SITE_EPOCH_MJD + STEP_DAY;
const DAYS_PER_YEAR = 365.25;

interface FollowedSite extends SiteTruth {
  /** Null: its decision failed. The last is the first again, glitching. */
  readonly followed: readonly (PulsarTimes | null)[];
}

interface Tally {
  sites: number;
  found: number;
  /** Steps that the clock did not make. */
  falseSteps: number;
  readonly pulls: number[];
}

function followedSite(seed: number): FollowedSite {
  const random = warmDice(seed);
  const stepUs = SIZES_US[seed % SIZES_US.length]! * (random.uniform() < 0.5 ? -1 : 1);
  const truth = { seed, stepUs, cadenceDays: 1 + 2 * random.uniform() };
  const glitchSize = logUniform(1e-8, 1e-6, random);
  const steady = Array.from({ length: MOST }, (_, i) => followed(pulsarOfSite(truth, i)));
  return { ...truth, followed: [...steady, followed(pulsarOfSite(truth, 0, glitchSize))] };
}

function followed({ model, log }: FoldedPulsar): PulsarTimes | null {
  try {
    const watch = startWatch(model, SETTINGS);
    for (const arrival of log) advance(watch, arrival);
    return pulsarTimes(watch);
  } catch (error) {
    console.error(`${model.name}: ${error}`);
    return null;
  }
}

function judge({ stepUs, followed: all }: FollowedSite, count: number, glitch: boolean, tally: Tally): void {
  const chosen = all.slice(0, count).map((times, i) => (glitch && i === 0 ? all.at(-1)! : times));
  const steps = siteSteps(chosen.filter((times) => times !== null));
  const right = steps.find(
    (step) =>
      step.afterMjd < STEP_MJD + 1 &&
      step.beforeMjd > STEP_MJD &&
      Math.abs(step.stepUs - stepUs) < Math.max(5 * step.uncertaintyUs, 0.3 * Math.abs(stepUs)),
  );
  tally.sites++;
  if (stepUs !== 0 && right !== undefined) {
    tally.found++;
    tally.pulls.push((right.stepUs - stepUs) / right.uncertaintyUs);
  }
  tally.falseSteps += steps.length - (stepUs !== 0 && right !== undefined ? 1 : 0);
}

function rms(values: readonly number[]): number {
  return Number(Math.sqrt(values.reduce((sum, x) => sum + x * x, 0) / values.length).toFixed(2));
}

function summary(tallies: ReadonlyMap<string, Tally>, sites: number) {
  const all = [...tallies.values()];
  const pulls = all.flatMap((tally) => tally.pulls);
  const sum = (of: (tally: Tally) => number) => all.reduce((total, tally) => total + of(tally), 0);
  const siteYears = (sum((tally) => tally.sites) * SITE_DAYS) / DAYS_PER_YEAR;
  return {
    date: new Date().toISOString().slice(0, 10),
    sites,
    siteYears: Number(siteYears.toFixed(1)),
    falseSteps: sum((tally) => tally.falseSteps),
    pulls: { count: pulls.length, rms: rms(pulls), beyond3: pulls.filter((pull) => Math.abs(pull) > 3).length },
    cells: [...tallies].map(([cell, { pulls: own, ...counts }]) => ({ cell, ...counts, pullRms: rms(own) })),
  };
}

const lines = KEPT_IN !== null && existsSync(KEPT_IN) ? readFileSync(KEPT_IN, 'utf8').trim().split('\n') : [];
const tallies = new Map<string, Tally>();
for (const size of SIZES_US)
  for (const count of COUNTS)
    for (const glitch of ['', ', a glitch that night'])
      tallies.set(`${size} µs, ${count} pulsars${glitch}`, { sites: 0, found: 0, falseSteps: 0, pulls: [] });
for (let seed = 1; seed <= SITES; seed++) {
  const line = lines[seed - 1];
  const site: FollowedSite = line === undefined ? followedSite(seed) : JSON.parse(line);
  if (line === undefined && KEPT_IN !== null) appendFileSync(KEPT_IN, `${JSON.stringify(site)}\n`);
  for (const [cell, tally] of tallies) {
    const [size, count] = cell.match(/\d+/g)!.map(Number);
    if (size === Math.abs(site.stepUs)) judge(site, count!, cell.endsWith('night'), tally);
  }
  writeFileSync(new URL('siteSteps.json', import.meta.url), `${JSON.stringify(summary(tallies, seed), null, 2)}\n`);
}
console.log(JSON.stringify(summary(tallies, SITES), null, 2));
