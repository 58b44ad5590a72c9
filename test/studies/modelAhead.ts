/**
 * Does the model that is handed out after a glitch predict the phase as well as it says? Pulsars with timing noise and a glitch
 * that recovers are followed until some weeks or months after it, the model is taken, and arrivals of the next month that the
 * detector has not seen are held against it: 1, 7 and 30 days on, in units of the stated standard deviation. The same watch is
 * asked twice: with the fitted recovery in the model, and with the decays that the filter follows in its place.
 * Run: npx tsx test/studies/modelAhead.ts [pulsars]. Writes modelAhead.json beside itself.
 */
import { writeFileSync } from 'node:fs';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import { advance, currentModel, type PulsarEvent, report, startWatch } from '../../detectors/index.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { detectorSettings } from '../../detectors/steps/threshold.ts';
import { glitchTurns } from '../support/simulatedGlitch.ts';
import { type Dice, dice, observingDays } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../support/simulatedWatch.ts';

const SEED = 77;
const PULSARS = Number(process.argv[2] ?? 200);
const AHEAD_DAYS = [1, 7, 30];
const NU = 11.2;
const NU_DOT = -1.5e-12;
const start = modelOf({ frequencyHz: '11.2', frequencyDerivativeHzPerS: NU_DOT, epochMjd: 60_000 });

function between(low: number, high: number, random: Dice): number {
  return low * (high / low) ** random.uniform();
}

function draw(random: Dice) {
  const cadenceDays = [1, 3, 7][Math.floor(3 * random.uniform())]!;
  const before = 40 + Math.floor(30 * random.uniform());
  const after = 15 + Math.floor(65 * random.uniform());
  const prior = noisePrior(NU, NU_DOT);
  const scatter = Math.exp(random.normal());
  const walks = {
    phaseWalk: prior.phaseWalk.median * scatter,
    frequencyWalk: prior.frequencyWalk.median * scatter,
    torqueWalk: prior.torqueWalk.median * scatter,
  };
  const uncertaintyUs = between(20, 300, random);
  const observed = observingDays(before + after, cadenceDays, 0.8, random);
  const size = between(3e-8, 3e-6, random) * NU;
  const q = between(0.02, 0.8, random);
  const glitch = {
    epochDays: (observed[before]! + observed[before - 1]!) / 2,
    persistentNuHz: size * (1 - q),
    decayingNuHz: size * q,
    timescaleDays: between(5, 150, random),
    persistentNuDotHzPerS: 0.005 * NU_DOT * random.normal(),
  };
  const days = [...observed, ...AHEAD_DAYS.map((day) => observed.at(-1)! + day)];
  const programme = { days, walks, uncertaintyUs, happening: (t: number) => -glitchTurns(glitch, t) };
  const arrivals = simulateTimedArrivals(start, programme, random);
  return { seen: arrivals.slice(0, -AHEAD_DAYS.length), coming: arrivals.slice(-AHEAD_DAYS.length), uncertaintyUs };
}

const sigmas = new Map<string, number[]>();

function note(name: string, value: number): void {
  sigmas.set(name, [...(sigmas.get(name) ?? []), value]);
}

let left = 0;
const random = dice(SEED);
for (let n = 0; n < PULSARS; n++) {
  const { seen, coming, uncertaintyUs } = draw(random);
  const watch = startWatch(start, detectorSettings(1, 1, start));
  for (const arrival of seen) advance(watch, arrival);
  const { events } = report(watch);
  const confirmed = events.filter(({ state }) => state === 'confirmed');
  // Of a glitch not confirmed yet, or not seen as one, there is no model to fold with after it.
  if (confirmed.length !== 1) {
    left += 1;
    continue;
  }
  const established = confirmed[0]!.recovery.terms.length > 0;
  const predict = (held: readonly PulsarEvent[], name: string): void => {
    const current = currentModel(watch, held)!;
    const phaseAt = phaseEvaluator(current.model);
    AHEAD_DAYS.forEach((days, i) => {
      const { deviationTurns } = phaseAt(coming[i]!.tdb);
      note(`${name}, ${days} d`, deviationTurns / Math.hypot(current.ahead[i]!.turns, uncertaintyUs * 1e-6 * NU));
    });
  };
  predict(events, established ? 'fitted recovery' : 'no recovery established');
  if (established)
    predict(
      events.map((event) => ({ ...event, recovery: { terms: [], q: null } })),
      'the same pulsars, decays as followed',
    );
  if (n % 10 === 9) save(n + 1);
}
save(PULSARS);

function save(pulsars: number): void {
  const share = (list: readonly number[], within: number) =>
    Number(((100 * list.filter((z) => Math.abs(z) < within).length) / list.length).toFixed(1));
  const rms = (list: readonly number[]) =>
    Number(Math.sqrt(list.reduce((sum, z) => sum + z * z, 0) / list.length).toFixed(2));
  const predictions = Object.fromEntries(
    [...sigmas].map(([name, list]) => [
      name,
      { n: list.length, within68Percent: share(list, 1), within95Percent: share(list, 2), rmsSigmas: rms(list) },
    ]),
  );
  const outcome = { date: new Date().toISOString().slice(0, 10), seed: SEED, pulsars, left, predictions };
  writeFileSync(new URL('./modelAhead.json', import.meta.url), `${JSON.stringify(outcome, null, 2)}\n`);
  if (pulsars === PULSARS) console.table(predictions);
}
