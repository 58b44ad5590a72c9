/**
 * How often a small site is understood: three pulsars, seen every few nights; its clock steps by 50 to 500 µs in the night
 * in which one of the three truly glitches by 1e-8 to 1e-6. Right: the step is one event of the site, of the right night and
 * size; the glitch is confirmed; nothing else is. `npx tsx test/studies/siteSteps.ts` writes the result beside itself.
 */
import { writeFileSync } from 'node:fs';
import {
  advance,
  detectorSettings,
  knownSteps,
  type PulsarModel,
  pulsarTimes,
  report,
  siteSteps,
  startWatch,
  type TimedArrival,
} from '../../detectors/index.ts';
import { type Dice, dice, observingDays } from '../support/simulatedPulsar.ts';
import { type Happening, modelOf, simulateTimedArrivals, spinUp } from '../support/simulatedWatch.ts';

const RUNS = Number(process.argv[2] ?? 200);
const EPOCH = 60_000;
const EVENT_DAY = 150;
const LAST_DAY = 210;
const FREQUENCIES_HZ = ['2.317', '6.143', '11.709'];
/** Neighbouring seeds would begin alike. */
const STRIDE = 7919;
const WARM_UP = 20;
const SETTINGS = detectorSettings(1, 3);

interface Run {
  readonly seed: number;
  readonly stepUs: number;
  readonly glitch: number;
  readonly foundUs: readonly number[];
  readonly confirmed: readonly string[];
  readonly right: boolean;
}

function logUniform(low: number, high: number, { uniform }: Dice): number {
  return low * (high / low) ** uniform();
}

function run(seed: number): Run {
  const random = dice(seed * STRIDE);
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  const stepUs = logUniform(50, 500, random) * (random.uniform() < 0.5 ? -1 : 1);
  const size = logUniform(1e-8, 1e-6, random);
  const cadence = 1 + 2 * random.uniform();
  const glitching = Math.floor(3 * random.uniform());
  const pulsars = FREQUENCIES_HZ.map((frequencyHz, i) => {
    const nu = Number(frequencyHz);
    const model = modelOf({ name: `KR 000${i}+00`, frequencyHz, frequencyDerivativeHzPerS: -1e-15, epochMjd: EPOCH });
    const clock: Happening = (t) => (t > EVENT_DAY ? stepUs * 1e-6 * nu : 0);
    const own = i === glitching ? spinUp(nu, EVENT_DAY - 0.2, size) : () => 0;
    const happening: Happening = (t, place) => clock(t, place) + own(t, place);
    const days = observingDays(Math.floor(LAST_DAY / cadence), cadence, 0.3, random);
    const walks = { phaseWalk: 1e-14, frequencyWalk: logUniform(1e-15, 1e-13, random), torqueWalk: 1e-22 };
    const uncertaintyUs = logUniform(5, 20, random);
    return { model, log: simulateTimedArrivals(model, { days, walks, uncertaintyUs, happening }, random) };
  });
  const follow = (model: PulsarModel, log: readonly TimedArrival[]) => {
    const watch = startWatch(model, SETTINGS);
    for (const arrival of log) advance(watch, arrival);
    return watch;
  };
  const times = pulsars.map(({ model, log }) => pulsarTimes(follow(model, log)));
  const steps = siteSteps(times);
  const confirmed = pulsars.flatMap(({ model, log }, i) => {
    const known = knownSteps(steps, times[i]!);
    return report(follow({ ...model, siteSteps: known }, log))
      .events.filter((e) => e.state === 'confirmed')
      .map((e) => `${i === glitching ? 'own ' : ''}${e.explanation}`);
  });
  const [step, ...others] = steps;
  const stepIsRight =
    step !== undefined &&
    others.length === 0 &&
    Math.abs(step.beforeMjd - EPOCH - EVENT_DAY) < 2 * cadence &&
    Math.abs(step.stepUs - stepUs) < 4 * step.uncertaintyUs;
  const right = stepIsRight && confirmed.length === 1 && confirmed[0] === 'own glitch';
  return { seed, stepUs, glitch: size, foundUs: steps.map((s) => s.stepUs), confirmed, right };
}

const runs = Array.from({ length: RUNS }, (_, i) => run(7000 + i));
const wrong = runs.filter((r) => !r.right);
const summary = { date: new Date().toISOString().slice(0, 10), runs: RUNS, right: RUNS - wrong.length, wrong };
console.log(`${summary.right} of ${RUNS} right`);
for (const r of wrong) console.log(JSON.stringify(r));
writeFileSync(new URL('siteSteps.result.json', import.meta.url), `${JSON.stringify(summary, null, 2)}\n`);
