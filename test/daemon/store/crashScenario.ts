// Run by crash.test.ts in a process of its own, which is killed at some step.
import { writeSync } from 'node:fs';
import { oneNight } from './oneNight.ts';

await oneNight(process.argv[2]!, (what) => {
  writeSync(1, `${what}\n`);
});
