// What one arrival costs the detector, of the process's own CPU time:  npx tsx test/bench/detector.ts
import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { dice, observingDays } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../support/simulatedWatch.ts';

const LEARNED = 1000;
const DECIDED = 500;
const PART = 50;
const MODEL = modelOf({ frequencyHz: '3.123456789', frequencyDerivativeHzPerS: -2e-14, epochMjd: 55_000 });
const WALKS = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };
const settings = detectorSettings(1, 100);

interface Case {
  readonly receivers: number;
  readonly uncertaintyUs: number;
  readonly cadenceDays: number;
  /** Every explanation carried through every arrival, for comparison. */
  readonly carriesAll?: boolean;
}

const cpuMicroseconds = (work: () => void): number => {
  const start = process.cpuUsage();
  work();
  const { user, system } = process.cpuUsage(start);
  return user + system;
};

function measure(given: Case): string {
  const { receivers, uncertaintyUs, cadenceDays, carriesAll = false } = given;
  const random = dice(2026);
  const days = observingDays(LEARNED + DECIDED, cadenceDays, 0.6, random);
  const arrivals = simulateTimedArrivals(MODEL, { days, walks: WALKS, uncertaintyUs }, random).map((arrival) => ({
    ...arrival,
    receiver: `receiver ${Math.floor(receivers * random.uniform())}`,
  }));
  const watch = startWatch(MODEL, settings);
  watch.carriesAll = carriesAll;
  const advanced = (from: number, until: number): number =>
    cpuMicroseconds(() => {
      for (let i = from; i < until; i++) advance(watch, arrivals[i]!);
    }) /
    (until - from);
  const learning = advanced(0, LEARNED);
  watch.nextLearning = Number.POSITIVE_INFINITY;
  const parts: number[] = [];
  for (let from = LEARNED; from < LEARNED + DECIDED; from += PART) parts.push(advanced(from, from + PART));
  const mean = parts.reduce((sum, cost) => sum + cost, 0) / parts.length;
  parts.sort((a, b) => a - b);
  const reported = cpuMicroseconds(() => report(watch));
  return [
    `${receivers} receivers, ${uncertaintyUs} µs every ${cadenceDays} d${carriesAll ? ', all carried' : ''}:`,
    `decision ${mean.toFixed(0)} µs an arrival (of fifties: least ${parts[0]!.toFixed(0)}, median ${parts[parts.length >> 1]!.toFixed(0)});`,
    `with the noise learned as it goes ${learning.toFixed(0)} µs; report ${(reported / 1000).toFixed(1)} ms`,
  ].join(' ');
}

console.log(`window ${settings.windowArrivals}, ${LEARNED} arrivals to begin with, then ${DECIDED} measured`);
measure({ receivers: 1, uncertaintyUs: 60, cadenceDays: 1 }); // warms the compiler
for (const receivers of [1, 5, 15])
  for (const uncertaintyUs of [60, 3000]) console.log(measure({ receivers, uncertaintyUs, cadenceDays: 1 }));
console.log(measure({ receivers: 1, uncertaintyUs: 300, cadenceDays: 14 }));
for (const receivers of [1, 5, 15])
  console.log(measure({ receivers, uncertaintyUs: 60, cadenceDays: 1, carriesAll: true }));
