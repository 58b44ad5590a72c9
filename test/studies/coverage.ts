/**
 * Do the stated intervals hold the truth as often as they say? Events are drawn from the prior that the posterior uses
 * (sizes, spin-down change, number of exponentials, timescales, epoch), over cadence, noise and number of arrivals; those
 * that a decision would confirm are fitted, and the truth is looked up in the 68 and 95 % intervals. The noise is known to
 * the fit, or (`--learned`) learned from the same arrivals as in the daemon. With `--recoveries` every event has an exponential,
 * and only timescales are looked at: a posterior with so many exponentials does not ask how often there is none.
 * Run: npx tsx test/studies/coverage.ts [--learned] [--recoveries] [events]. Writes coverage….json beside itself.
 */
import { writeFileSync } from 'node:fs';
import type { CountedArrival } from '../../detectors/filter/countedArrival.ts';
import { learnNoise } from '../../detectors/filter/noiseLearning.ts';
import { withMargin } from '../../detectors/filter/noiseMargin.ts';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { fitGlitch, type GlitchFit } from '../../detectors/recovery/glitchFit.ts';
import { TERMS_PRIOR, timescaleRange } from '../../detectors/recovery/glitchModels.ts';
import type { Estimate } from '../../detectors/recovery/mixture.ts';
import { defaultSizePrior } from '../../detectors/recovery/sizePrior.ts';
import type { NoiseModel } from '../../detectors/report.ts';
import { withoutRecovery } from '../../detectors/steps/establishedRecoveries.ts';
import { withGlitch } from '../support/simulatedGlitch.ts';
import { type Dice, dice, observingDays, simulateArrivals } from '../support/simulatedPulsar.ts';

const SEED = 20_270_117;
const LEARNED = process.argv.includes('--learned');
const RECOVERIES = process.argv.includes('--recoveries');
const EVENTS = Number(process.argv.slice(2).find((word) => /^\d+$/.test(word)) ?? 1000);
/** Natural-log Bayes factor from which an event is looked at: about the daemon's own threshold. */
const CONFIRMED = 9;
const SECONDS_PER_DAY = 86_400;

interface Drawn {
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
  readonly arrivals: CountedArrival[];
  readonly after: number;
  readonly noise: NoiseModel;
  readonly truth: Truth;
}

interface Truth {
  readonly epochDays: number;
  readonly deltaNuHz: number;
  readonly deltaNuDotHzPerS: number;
  readonly q: number;
  readonly terms: readonly { readonly timescaleDays: number; readonly stepHz: number }[];
  readonly cadenceDays: number;
}

function choose<T>(list: readonly T[], random: Dice): T {
  return list[Math.floor(random.uniform() * list.length)]!;
}

function between(low: number, high: number, random: Dice): number {
  return low * (high / low) ** random.uniform();
}

function draw(random: Dice): Drawn {
  const frequencyHz = between(0.5, 30, random);
  const frequencyDerivativeHzPerS = -between(1e-15, 1e-11, random);
  const prior = noisePrior(frequencyHz, frequencyDerivativeHzPerS);
  const scatter = Math.exp(1.5 * random.normal());
  const walks = {
    phaseWalk: prior.phaseWalk.median * scatter,
    frequencyWalk: prior.frequencyWalk.median * scatter,
    torqueWalk: prior.torqueWalk.median * scatter,
  };
  const cadenceDays = choose([1, 3, 7, 14, 30], random);
  const before = 30 + Math.floor(90 * random.uniform());
  const afterwards = 5 + Math.floor(120 * random.uniform());
  const sigmaTurns = between(1e-4, 5e-3, random);
  const days = observingDays(before + afterwards, cadenceDays, 0.8, random);
  const quiet = simulateArrivals(days, walks, sigmaTurns, random);
  const gap = { after: before, endDays: days[before]!, lengthDays: days[before]! - days[before - 1]! };
  const range = timescaleRange({ arrivals: quiet }, gap);
  const sizes = defaultSizePrior(frequencyHz, frequencyDerivativeHzPerS);
  const step = choose(sizes.frequencyStepsHz, random);
  const persistentNuHz = step * random.normal();
  const persistentNuDotHzPerS = choose(sizes.derivativeStepsHzPerS, random) * random.normal();
  const part = choose(sizes.decayingParts, random);
  const pick = RECOVERIES ? TERMS_PRIOR[0] + (1 - TERMS_PRIOR[0]) * random.uniform() : random.uniform();
  const count = TERMS_PRIOR.findIndex((_, k) => pick < TERMS_PRIOR.slice(0, k + 1).reduce((a, b) => a + b, 0));
  const terms = Array.from({ length: count }, () => ({
    timescaleDays: between(range.lowDays, range.highDays, random),
    stepHz: part * step * random.normal(),
  })).sort((a, b) => a.timescaleDays - b.timescaleDays);
  const epochDays = gap.endDays - gap.lengthDays * random.uniform();
  let arrivals = withGlitch(quiet, {
    epochDays,
    persistentNuHz,
    persistentNuDotHzPerS,
    decayingNuHz: 0,
    timescaleDays: 1,
  });
  for (const { timescaleDays, stepHz } of terms)
    arrivals = withGlitch(arrivals, {
      epochDays,
      persistentNuHz: 0,
      persistentNuDotHzPerS: 0,
      decayingNuHz: stepHz,
      timescaleDays,
    });
  const decaying = terms.reduce((sum, { stepHz }) => sum + stepHz, 0);
  const deltaNuHz = persistentNuHz + decaying;
  return {
    frequencyHz,
    frequencyDerivativeHzPerS,
    arrivals,
    after: before,
    noise: { ...walks, uncertaintyScale: 1, floorTurns: 0 },
    truth: {
      epochDays,
      deltaNuHz,
      deltaNuDotHzPerS: terms.reduce(
        (sum, { stepHz, timescaleDays }) => sum - stepHz / (timescaleDays * SECONDS_PER_DAY),
        persistentNuDotHzPerS,
      ),
      q: decaying / deltaNuHz,
      terms,
      cadenceDays,
    },
  };
}

interface Tally {
  n: number;
  in68: number;
  in95: number;
}

const tallies = new Map<string, Tally>();

function look(name: string, { interval68, interval95 }: Estimate, truth: number): void {
  const tally = tallies.get(name) ?? { n: 0, in68: 0, in95: 0 };
  tallies.set(name, tally);
  tally.n += 1;
  tally.in68 += Number(interval68[0] <= truth && truth <= interval68[1]);
  tally.in95 += Number(interval95[0] <= truth && truth <= interval95[1]);
}

function lookAtSizes(fit: GlitchFit, truth: Truth): void {
  look('epoch', fit.epochDays, truth.epochDays);
  // An exponential that counts as a delayed rise is no part of Δν at the epoch: the truth is told by the same rule.
  const rises = fit.recovery?.terms.some(({ kind }) => kind === 'delayed rise') ?? false;
  if (!rises) {
    look('deltaNu', fit.deltaNuHz, truth.deltaNuHz);
    look(
      fit.deltaNuDotConstrained ? 'deltaNuDot' : 'deltaNuDot, not constrained',
      fit.deltaNuDotHzPerS,
      truth.deltaNuDotHzPerS,
    );
    if (fit.recovery !== null) look('q', fit.recovery.q, truth.q);
  }
}

function fitOf(event: Drawn): GlitchFit {
  if (!LEARNED) return fitWith(event, event.noise);
  const first = fitWith(event, learnedNoise(event, event.arrivals));
  // An exponential left in is learned as noise: once it is established it is taken off, as the daemon does.
  return first.recovery === null ? first : fitWith(event, learnedNoise(event, withoutRecovery(event.arrivals, first)));
}

/** As the daemon takes it: with its margin. */
function learnedNoise(
  { after, frequencyHz, frequencyDerivativeHzPerS }: Drawn,
  arrivals: readonly CountedArrival[],
): NoiseModel {
  const prior = noisePrior(frequencyHz, frequencyDerivativeHzPerS);
  const known = [{ beforeIndex: after, kind: 'spin' as const }];
  return withMargin(learnNoise(arrivals, known, prior), arrivals, known, prior, arrivals.length);
}

function fitWith({ arrivals, after, frequencyHz, frequencyDerivativeHzPerS }: Drawn, noise: NoiseModel): GlitchFit {
  return fitGlitch({
    arrivals,
    noise,
    firstGapBeforeIndex: after,
    lastGapBeforeIndex: after,
    disturbances: [],
    frequencyHz,
    frequencyDerivativeHzPerS,
  });
}

const random = dice(SEED);
const began = performance.now();
let drawn = 0;
let kept = 0;
let seconds = 0;
const termsFound: Record<string, number> = {};
while (kept < EVENTS) {
  const event = draw(random);
  drawn += 1;
  const { truth } = event;
  const start = process.cpuUsage().user;
  const fit = fitOf(event);
  seconds += (process.cpuUsage().user - start) / 1e6;
  if (fit.logEvidence - fit.logEvidenceNone < CONFIRMED) continue;
  kept += 1;
  if (kept % 100 === 0) save();
  if (!RECOVERIES) lookAtSizes(fit, truth);
  // Given that so many were drawn, an interval of the posterior with as many holds the truth as often as it says.
  const found = fit.recovery?.terms ?? [];
  const key = `${truth.terms.length} drawn, ${found.length} stated`;
  termsFound[key] = (termsFound[key] ?? 0) + 1;
  if (found.length === truth.terms.length)
    found.forEach(({ timescaleDays }, j) => {
      look('timescale', timescaleDays, truth.terms[j]!.timescaleDays);
    });
}

function tableOf(): Record<string, { events: number; within68Percent: number; within95Percent: number }> {
  return Object.fromEntries(
    [...tallies].map(([name, { n, in68, in95 }]) => [
      name,
      { events: n, within68Percent: round((100 * in68) / n), within95Percent: round((100 * in95) / n) },
    ]),
  );
}

function save(): void {
  const outcome = {
    date: new Date().toISOString().slice(0, 10),
    seed: SEED,
    noise: LEARNED ? 'learned from the same arrivals' : 'known to the fit',
    events: kept,
    drawn,
    secondsPerFit: round(seconds / drawn, 3),
    coverage: tableOf(),
    exponentials: Object.fromEntries(Object.entries(termsFound).sort()),
  };
  const name = `coverage${LEARNED ? 'Learned' : ''}${RECOVERIES ? 'Recoveries' : ''}.json`;
  const file = new URL(name, import.meta.url);
  writeFileSync(file, `${JSON.stringify(outcome, null, 2)}\n`);
}

save();
console.table(tableOf());
console.log(`${((performance.now() - began) / 1000).toFixed(0)} s`);

function round(value: number, digits = 1): number {
  return Number(value.toFixed(digits));
}
