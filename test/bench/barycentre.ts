// How many arrivals one core brings to the barycentre in a second of its own time (other processes do not count), beside what a
// general-purpose library takes for the larger part of the same work (barycentre-astropy.py; Debian python3-astropy, python3-jplephem):
//     npx tsx test/bench/barycentre.ts
import { execFileSync } from 'node:child_process';
import { existsSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import type { BarycentredArrival, ReceivedArrival } from '../../detectors/arrival.ts';
import { barycentre, barycentreTowards } from '../../detectors/sky/barycentre.ts';
import { pulsarDirection } from '../../detectors/sky/delays.ts';
import { parseEarthOrientation } from '../../detectors/sky/earthOrientationFile.ts';
import { readSpkKernel } from '../../detectors/sky/spkFile.ts';
import { builtInArrays } from '../support/builtInKernel.ts';
import { arrivalAt, orientationOf, pulsarAt } from '../support/sky.ts';
import { inMemory, spkFile } from '../support/spkFile.ts';

const ARRIVALS = 100_000;
const ROUNDS = 5;
const FIRST_DAY = 50_000;
const DAYS = 9900;
/** The IERS's C04 as Debian's python3-astropy packages it. */
const C04 = '/usr/lib/python3/dist-packages/astropy/utils/iers/data/eopc04_IAU2000.62-now';

const { tables: shipped } = loadTables();
const tables = { ...shipped, orientation: orientation() };
const site = {
  itrfM: [3_822_626.04, -154_105.65, 5_086_486.04],
  clock: { name: 'bench', mjd: Float64Array.of(49_000, 61_000), addSeconds: Float64Array.of(1e-6, 3e-6) },
} as const;
const model = pulsarAt({});
const arrivals: ReceivedArrival[] = Array.from({ length: ARRIVALS }, (_, i) => ({
  ...arrivalAt('50000', 1400),
  time: { day: FIRST_DAY + (i % DAYS), fraction: (i * 0.618_034) % 1 },
}));

function orientation() {
  const parsed = existsSync(C04) ? parseEarthOrientation(readFileSync(C04, 'utf8'), 'C04') : { problem: 'no C04' };
  return 'table' in parsed ? parsed.table : orientationOf(-0.12, 0.1, 0.3);
}

function kernelBytes(): Uint8Array {
  return spkFile(builtInArrays(FIRST_DAY - 10, FIRST_DAY + DAYS + 10));
}

function processorMs(): number {
  return process.cpuUsage().user / 1000;
}

function median(rates: readonly number[]): number {
  return [...rates].sort((a, b) => a - b)[rates.length >> 1]!;
}

/** Median arrivals a second. */
function measure(name: string, run: (arrival: ReceivedArrival) => BarycentredArrival): number {
  const rates: number[] = [];
  let check = 0;
  for (let round = 0; round < ROUNDS; round++) {
    const start = processorMs();
    for (const arrival of arrivals) check += run(arrival).tdb.fraction;
    rates.push((1000 * ARRIVALS) / (processorMs() - start));
  }
  const best = Math.max(...rates).toFixed(0);
  console.info(`${name}: ${median(rates).toFixed(0)} arrivals/s (best ${best}; check ${check.toFixed(3)})`);
  return median(rates);
}

/** Largest difference in (TDB − TT) + light path to a pulsar that stands still at infinity, without the site's clock, ns. */
function largestDifferenceNs(theirs: readonly number[]): number {
  const still = pulsarDirection(pulsarAt({ parallaxMas: 0, properMotionMasPerYr: [0, 0] }));
  const differences = theirs.map((seconds, i) => {
    const { delays } = barycentreTowards(arrivals[100 * i]!, still, { ...site, clock: null }, tables);
    return Math.abs(delays.tdbMinusTtS + delays.roemerS - seconds);
  });
  return Math.max(...differences) * 1e9;
}

function againstAstropy(ourRate: number): void {
  const scratch = mkdtempSync(join(tmpdir(), 'spinvigil-bench-'));
  try {
    const kernel = join(scratch, 'built-in.bsp');
    writeFileSync(kernel, kernelBytes());
    const script = new URL('./barycentre-astropy.py', import.meta.url).pathname;
    const answer = execFileSync('/usr/bin/python3', [script, kernel, scratch, String(ARRIVALS)], {
      encoding: 'utf8',
      maxBuffer: 1e8,
    });
    const { version, rates, check } = JSON.parse(answer) as { version: string; rates: number[]; check: number[] };
    const theirRate = median(rates);
    console.info(
      `astropy ${version}, one array, same kernel and C04, without site clock, Shapiro, dispersion, parallax: ${theirRate.toFixed(0)} arrivals/s (best ${Math.max(...rates).toFixed(0)})`,
    );
    console.info(`barycentreTowards against astropy: ${(ourRate / theirRate).toFixed(1)} times as fast`);
    console.info(`largest difference in (TDB − TT) + light path: ${largestDifferenceNs(check).toFixed(1)} ns`);
  } catch (error) {
    console.warn(`SKIPPED the comparison: Debian packages python3-astropy and python3-jplephem are needed (${error})`);
  } finally {
    rmSync(scratch, { recursive: true, force: true });
  }
}

const direction = pulsarDirection(model);
measure('barycentre', (arrival) => barycentre(arrival, model, site, tables));
const rate = measure('barycentreTowards', (arrival) => barycentreTowards(arrival, direction, site, tables));
const kernel = readSpkKernel(inMemory(kernelBytes()), {
  name: 'bench',
  fromMjd: FIRST_DAY,
  toMjd: FIRST_DAY + DAYS + 1,
});
if ('problem' in kernel) throw new Error(kernel.problem);
const fromKernel = { ...tables, earthSun: kernel.kernel };
measure('barycentreTowards, SPK kernel', (arrival) => barycentreTowards(arrival, direction, site, fromKernel));
againstAstropy(rate);
