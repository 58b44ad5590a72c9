/** Time of one refit of an event, processor seconds. Run: npx tsx test/bench/recovery.ts */
import { fitGlitch } from '../../detectors/recovery/glitchFit.ts';
import { withGlitch } from '../support/simulatedGlitch.ts';
import { dice, observingDays, simulateArrivals } from '../support/simulatedPulsar.ts';

const ARRIVALS = 500;
const REPEATS = 5;
const frequencyHz = 11.2;
const walks = { phaseWalk: 1e-10, frequencyWalk: 1e-12, torqueWalk: 1e-17 };
const NO_STEP = { persistentNuHz: 0, persistentNuDotHzPerS: 0, decayingNuHz: 0, timescaleDays: 1 };

const TWO = [
  [0.1, 10],
  [0.2, 100],
] as const;
const THREE = [...TWO, [0.3, 1]] as const;

/** `around`: candidate gaps on each side of the right one. */
for (const [name, sizeHz, recoveries, around] of [
  ['1e-8 of ν, no recovery', 1e-7, [], 0],
  ['1e-8 of ν, no recovery, nine gaps', 1e-7, [], 4],
  ['1e-7 of ν, one recovery', 1e-6, [[0.1, 30]], 0],
  ['1e-7 of ν, two recoveries', 1e-6, TWO, 0],
  ['1e-7 of ν, two recoveries, nine gaps', 1e-6, TWO, 4],
  ['1e-5 of ν, three recoveries', 1e-4, THREE, 0],
  ['1e-5 of ν, three recoveries, nine gaps', 1e-4, THREE, 4],
] as const) {
  const random = dice(5);
  const days = observingDays(ARRIVALS, 2, 0.8, random);
  const after = ARRIVALS / 2;
  const epochDays = days[after]! - 0.6;
  const step = { ...NO_STEP, epochDays };
  let arrivals = withGlitch(simulateArrivals(days, walks, 5e-4, random), { ...step, persistentNuHz: sizeHz });
  for (const [fraction, timescaleDays] of recoveries)
    arrivals = withGlitch(arrivals, { ...step, decayingNuHz: fraction * sizeHz, timescaleDays });
  const times = Array.from({ length: REPEATS }, () => {
    const before = process.cpuUsage();
    const fit = fitGlitch({
      arrivals,
      noise: { ...walks, uncertaintyScale: 1, floorTurns: 0 },
      firstGapBeforeIndex: after - around,
      lastGapBeforeIndex: after + around,
      disturbances: [],
      frequencyHz,
      frequencyDerivativeHzPerS: -1.56e-11,
    });
    if ((fit.recovery?.terms.length ?? 0) !== recoveries.length)
      console.log(`${name}: ${fit.recovery?.terms.length ?? 0} recoveries established`);
    return process.cpuUsage(before).user / 1e6;
  }).sort((a, b) => a - b);
  console.log(
    `${ARRIVALS} arrivals, ${name}: ${times[REPEATS >> 1]!.toFixed(3)} s, the first ${times.at(-1)!.toFixed(3)} s`,
  );
}
