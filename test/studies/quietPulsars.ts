// False events of pulsars that wander but never glitch:  npx tsx test/studies/quietPulsars.ts [SEED] [PULSARS]
// Walks in frequency or torque of 0.01 to 3 times the errors within 30 days, whatever the spin-down: harsher than real pulsars.
// Writes what it found beside itself.
import { writeFileSync } from 'node:fs';
import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { type Dice, dice, observingDays } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../support/simulatedWatch.ts';

const seed = Number(process.argv[2] ?? 5000);
const pulsars = Number(process.argv[3] ?? 150);
const EPOCH_MJD = 58_000;
const WARM_UP = 20;
/** Primes apart, so that neighbouring pulsars do not begin alike. */
const STRIDE = 7919;

/** Years followed, and the explanations of what was confirmed. */
function follow(random: Dice): { years: number; confirmed: string[] } {
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  const frequencyHz = 10 ** (-0.5 + 1.8 * random.uniform());
  const cadenceDays = [1, 3, 7, 14][Math.floor(4 * random.uniform())]!;
  const uncertaintyUs = 10 ** (1.3 + 1.7 * random.uniform());
  const model = modelOf({
    frequencyHz: frequencyHz.toFixed(12),
    frequencyDerivativeHzPerS: -(10 ** (-15.5 + 3 * random.uniform())),
    epochMjd: EPOCH_MJD,
  });
  const kind = Math.floor(3 * random.uniform());
  const wander = 10 ** (-2 + 2.5 * random.uniform()) * uncertaintyUs * 1e-6 * frequencyHz;
  const walks = {
    phaseWalk: 0,
    frequencyWalk: kind === 1 ? (3 * wander ** 2) / 30 ** 3 : 0,
    torqueWalk: kind === 2 ? (20 * wander ** 2) / 30 ** 5 : 0,
  };
  const days = observingDays(cadenceDays <= 3 ? 180 : 100, cadenceDays, 0.6, random);
  const watch = startWatch(model, detectorSettings(1, 100));
  for (const arrival of simulateTimedArrivals(model, { days, walks, uncertaintyUs }, random)) advance(watch, arrival);
  // Whatever was ever confirmed was mailed, though it may have been withdrawn since.
  const confirmed = report(watch).events.filter((e) => e.confirmedAtMjd !== null);
  return { years: (days.at(-1)! - days[0]!) / 365.25, confirmed: confirmed.map((e) => e.explanation) };
}

let years = 0;
const confirmed: Record<string, number> = {};
for (let n = 0; n < pulsars; n++) {
  const found = follow(dice(seed + n * STRIDE));
  years += found.years;
  for (const explanation of found.confirmed) confirmed[explanation] = (confirmed[explanation] ?? 0) + 1;
}
const result = { date: new Date().toISOString().slice(0, 10), seed, pulsars, years: Math.round(years), confirmed };
writeFileSync(new URL('quietPulsars.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(result);
