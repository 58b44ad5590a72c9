// A million damaged files of every layout:  npx tsx test/studies/mutatedLayouts.ts [SEED] [MOST_MINUTES]
// Ends with an error at the first row that a slow reader does not read the same. Writes what it found beside itself.
import { writeFileSync } from 'node:fs';
import { readMutatedFiles } from '../support/mutatedLayouts.ts';

const FILES = 1_000_000;
const seed = Number(process.argv[2] ?? 1);
const mostMinutes = Number(process.argv[3] ?? 60);

const end = performance.now() + mostMinutes * 60_000;
const count = readMutatedFiles(seed, FILES, () => performance.now() > end);
const result = {
  date: new Date().toISOString().slice(0, 10),
  seed,
  ...count,
  slowestMs: Number(count.slowestMs.toFixed(1)),
  largestMemoryMiB: Math.round(process.resourceUsage().maxRSS / 1024),
};
writeFileSync(new URL('mutatedLayouts.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(result);
