// How many arrivals a second of processor time the record takes in, and how large it grows:  npx tsx test/bench/store.ts
import { statSync } from 'node:fs';
import { join } from 'node:path';
import { fileBatch, open, temporaryFolder } from '../daemon/store/sample.ts';

const ROWS = 10_000;
const FILES = 5;

const folder = temporaryFolder();
const store = open(folder.path);
const seconds = (work: () => void): number => {
  const start = process.cpuUsage();
  work();
  const { user, system } = process.cpuUsage(start);
  return (user + system) / 1e6;
};
for (let n = 0; n < FILES; n += 1) {
  const batch = fileBatch(n * ROWS, ROWS, { path: `${n}.csv` });
  const taken = seconds(() => store.commitIntake(batch));
  console.log(`a file of ${ROWS} arrivals: ${Math.round(ROWS / taken)} arrivals/s`);
}
const one = seconds(() => {
  for (let n = 0; n < 200; n += 1) store.commitIntake(fileBatch(FILES * ROWS + n, 1, { path: `one-${n}.csv` }));
});
console.log(`files of one arrival: ${Math.round(200 / one)} files/s`);
let found = 0;
const read = seconds(() => {
  found = store.arrivals('KR 0417+31').length;
});
console.log(`read back: ${Math.round(found / read)} arrivals/s`);
const timed = seconds(() => store.timedArrivals('KR 0417+31'));
console.log(`for the detector: ${Math.round(found / timed)} arrivals/s`);
const near = seconds(() => {
  for (let n = 0; n < ROWS; n += 1)
    store.arrivalsNear('KR 0417+31', { day: 60_000 + n, fraction: 0.1234567890123457 }, 1e-6);
});
console.log(`arrivals near a time: ${Math.round(ROWS / near)} questions/s`);
console.log(`verify: ${seconds(() => store.verify()).toFixed(2)} s`);
store.close();
console.log(`record: ${Math.round(statSync(join(folder.path, 'record.db')).size / found)} bytes an arrival`);
folder.remove();
