// How many arrivals one core brings to the barycentre in a second of its own time (other processes do not count):
//     npx tsx test/bench/barycentre.ts
import { loadTables } from '../../daemon/tables/loadTables.ts';
import type { ReceivedArrival } from '../../detectors/arrival.ts';
import { barycentre, barycentreTowards } from '../../detectors/sky/barycentre.ts';
import { pulsarDirection } from '../../detectors/sky/delays.ts';
import { arrivalAt, orientationOf, pulsarAt } from '../support/sky.ts';

const ARRIVALS = 100_000;
const ROUNDS = 5;

const { tables: shipped } = loadTables();
const tables = { ...shipped, orientation: orientationOf(-0.12, 0.1, 0.3) };
const site = {
  itrfM: [3_822_626.04, -154_105.65, 5_086_486.04],
  clock: { name: 'bench', mjd: Float64Array.of(50_000, 61_000), addSeconds: Float64Array.of(1e-6, 3e-6) },
} as const;
const model = pulsarAt({});
const arrivals: ReceivedArrival[] = Array.from({ length: ARRIVALS }, (_, i) => ({
  ...arrivalAt('50000', 1400),
  time: { day: 50_000 + (i % 10_000), fraction: (i * 0.618_034) % 1 },
}));

function processorMs(): number {
  return process.cpuUsage().user / 1000;
}

function measure(
  name: string,
  run: (arrival: ReceivedArrival) => { readonly tdb: { readonly fraction: number } },
): void {
  const rates: number[] = [];
  let check = 0;
  for (let round = 0; round < ROUNDS; round++) {
    const start = processorMs();
    for (const arrival of arrivals) check += run(arrival).tdb.fraction;
    rates.push((1000 * ARRIVALS) / (processorMs() - start));
  }
  const best = Math.max(...rates).toFixed(0);
  const median = rates.sort((a, b) => a - b)[ROUNDS >> 1]!.toFixed(0);
  console.info(`${name}: ${median} arrivals/s (best ${best}; check ${check.toFixed(3)})`);
}

const direction = pulsarDirection(model);
measure('barycentre', (arrival) => barycentre(arrival, model, site, tables));
measure('barycentreTowards', (arrival) => barycentreTowards(arrival, direction, site, tables));
