// Forty years of many receivers:  npx tsx test/studies/longArchives.ts [SEED] [PULSARS]
// What is confirmed in simulated long records (test/support/longArchive.ts), against what was planted.
// Writes what it found beside itself.
import { writeFileSync } from 'node:fs';
import { advance, detectorSettings, type PulsarEvent, report, startWatch } from '../../detectors/index.ts';
import { EPOCH_MJD, longArchive, type PlantedGlitch } from '../support/longArchive.ts';
import { dice } from '../support/simulatedPulsar.ts';

const seed = Number(process.argv[2] ?? 1);
const pulsars = Number(process.argv[3] ?? 60);
const WARM_UP = 20;
/** Primes apart, so that neighbouring pulsars do not begin alike. */
const STRIDE = 7919;
const PROGRAMME = 560;
/** A glitch that makes so many times the turns that hide it should not be missed. */
const CLEAR = 20;

const tally = {
  years: 0,
  arrivals: 0,
  planted: 0,
  found: 0,
  clear: 0,
  clearFound: 0,
  clearSizes: 0,
  lostCounts: 0,
  notLocked: 0,
};
const wrong: string[] = [];
const missed: string[] = [];

for (let n = 0; n < pulsars; n++) {
  const random = dice(seed + n * STRIDE);
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  const { model, arrivals, glitches, years } = longArchive(random);
  const watch = startWatch(model, detectorSettings(1, PROGRAMME));
  for (const arrival of arrivals) advance(watch, arrival);
  const { events, locked } = report(watch);
  const confirmed = events.filter((e) => e.state === 'confirmed');
  const daysOf = (i: number) => arrivals[i]!.tdb.day + arrivals[i]!.tdb.fraction - EPOCH_MJD;
  const matched = new Set<PulsarEvent>();
  for (const glitch of glitches) {
    const after = arrivals.findIndex((_, i) => daysOf(i) > glitch.tDays);
    const slack = Math.max(40, after > 0 ? 2 * (daysOf(after) - daysOf(after - 1)) : 0);
    const event = confirmed.find((e) => !matched.has(e) && Math.abs(e.epochMjd - EPOCH_MJD - glitch.tDays) < slack);
    if (event !== undefined) matched.add(event);
    count(glitch, event, n);
  }
  tally.years += years;
  tally.arrivals += arrivals.length;
  tally.notLocked += locked ? 0 : 1;
  for (const event of confirmed.filter((e) => !matched.has(e)))
    if (event.explanation === 'lost count') tally.lostCounts++;
    else wrong.push(`pulsar ${n}: ${event.explanation} ${event.deltaNuOverNu?.toExponential(1) ?? ''}`);
}

function count(glitch: PlantedGlitch, event: PulsarEvent | undefined, pulsar: number): void {
  const isFound = event?.explanation === 'glitch' || event?.explanation === 'slow spin-up';
  const size = event?.deltaNuOverNu ?? 0;
  tally.planted++;
  if (isFound) tally.found++;
  if (glitch.signalToNoise < CLEAR) return;
  tally.clear++;
  if (isFound) tally.clearFound++;
  if (isFound && Math.abs(size / glitch.relativeSize - 1) < 0.05) tally.clearSizes++;
  else
    missed.push(
      `pulsar ${pulsar}: ${glitch.relativeSize.toExponential(2)} as ${event?.explanation ?? 'nothing'} ${size.toExponential(2)}`,
    );
}

const result = { date: new Date().toISOString().slice(0, 10), seed, pulsars, ...tally, wrong, missed };
writeFileSync(new URL('longArchives.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(result);
