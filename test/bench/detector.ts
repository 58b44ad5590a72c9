// What one arrival costs the detector, of the process's own CPU time:  npx tsx test/bench/detector.ts
import { advance, detectorSettings, report, startWatch } from '../../detectors/index.ts';
import { dice, observingDays } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals } from '../support/simulatedWatch.ts';

const ARRIVALS = 2000;
const model = modelOf({ frequencyHz: '3.123456789', frequencyDerivativeHzPerS: -2e-14, epochMjd: 55_000 });
const random = dice(2026);
const days = observingDays(ARRIVALS, 1, 0.6, random);
const walks = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };
const arrivals = simulateTimedArrivals(model, { days, walks, uncertaintyUs: 60 }, random);

const cpuSeconds = (work: () => void): number => {
  const start = process.cpuUsage();
  work();
  const { user, system } = process.cpuUsage(start);
  return (user + system) / 1e6;
};

const settings = detectorSettings(1, 100);
// Twice: the first pass warms the compiler.
for (const pass of ['first pass', 'second pass']) {
  const watch = startWatch(model, settings);
  const whole = cpuSeconds(() => {
    for (const arrival of arrivals) advance(watch, arrival);
  });
  console.log(`${pass}: ${ARRIVALS} daily arrivals, window ${settings.windowArrivals}, noise learned as it goes:`);
  console.log(`  ${Math.round(ARRIVALS / whole)} arrivals/s, ${((whole / ARRIVALS) * 1e6).toFixed(0)} µs an arrival`);
  watch.nextLearning = Number.POSITIVE_INFINITY;
  const more = simulateTimedArrivals(
    model,
    { days: days.slice(0, 300).map((d) => d + ARRIVALS), walks, uncertaintyUs: 60 },
    random,
  );
  const between = cpuSeconds(() => {
    for (const arrival of more) advance(watch, arrival);
  });
  console.log(`  between learnings: ${((between / more.length) * 1e6).toFixed(0)} µs an arrival`);
  console.log(`  report: ${(cpuSeconds(() => report(watch)) * 1e3).toFixed(1)} ms, no events`);
}
