// Are stated limits true?  npx tsx test/studies/limits.ts [SEED] [PULSARS PER CELL]
// A pulsar is followed quietly until its noise is learned; its limit is stated; a glitch of just that size follows at a random time,
// and the real detector has the stated number of days to confirm it. Writes what it found beside itself.
import { writeFileSync } from 'node:fs';
import { advance, detectorSettings, startWatch } from '../../detectors/index.ts';
import { detectionLimit } from '../../detectors/limits/detectionLimit.ts';
import type { PulsarWatch } from '../../detectors/steps/pulsarWatch.ts';
import { type Dice, dice } from '../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from '../support/simulatedWatch.ts';

const seed = Number(process.argv[2] ?? 2026);
const perCell = Number(process.argv[3] ?? 100);
const only = process.argv[4] ?? '';
const EPOCH_MJD = 58_000;
const WARM_UP = 20;
/** As many arrivals ahead as the detector's window holds, and ten for the random epoch. */
const AHEAD = 110;
/** Primes apart, so that neighbouring pulsars do not begin alike. */
const STRIDE = 7919;

/** Arrivals before the limit is stated, and the gap before an arrival, days. */
const CADENCES: Readonly<Record<string, { readonly past: number; readonly gap: (random: Dice) => number }>> = {
  weekly: { past: 80, gap: ({ uniform }) => 7 + 2 * (uniform() - 0.5) },
  monthly: { past: 50, gap: ({ uniform }) => 30 + 6 * (uniform() - 0.5) },
  irregular: { past: 80, gap: ({ uniform }) => -6 * Math.log(1 - uniform()) + 0.5 },
  '3-day': { past: 100, gap: ({ uniform }) => 3 + 0.6 * (uniform() - 0.5) },
  daily: { past: 120, gap: ({ uniform }) => 1 + 0.2 * (uniform() - 0.5) },
};
const NOISES = ['white', 'frequency walk', 'torque walk'];

interface Trial {
  readonly delayDays: number;
  readonly confirmed: boolean;
}

/** Null: no limit could be stated, or the quiet pulsar was under suspicion already. */
function trial(random: Dice, { cadence, noise, receivers }: Kind): Trial | null {
  for (let i = 0; i < WARM_UP; i++) random.uniform();
  const { past, gap } = CADENCES[cadence]!;
  const frequencyHz = 10 ** (-0.3 + 1.3 * random.uniform());
  const uncertaintyUs = 10 ** (1.5 + 1.2 * random.uniform());
  const model = modelOf({
    frequencyHz: frequencyHz.toFixed(12),
    frequencyDerivativeHzPerS: -(10 ** (-15 + 2 * random.uniform())),
    epochMjd: EPOCH_MJD,
  });
  const days = [0];
  while (days.length < past + AHEAD) days.push(days.at(-1)! + gap(random));
  const wander = 10 ** (-0.5 + random.uniform()) * uncertaintyUs * 1e-6 * frequencyHz;
  const walks = {
    phaseWalk: 0,
    frequencyWalk: noise === 'frequency walk' ? (3 * wander ** 2) / 30 ** 3 : 0,
    torqueWalk: noise === 'torque walk' ? (20 * wander ** 2) / 30 ** 5 : 0,
  };
  const [earliest, latest] = [days[past - 1]!, days[past + 9]!];
  const epochDays = earliest + (latest - earliest) * random.uniform();
  const noiseSeed = Math.floor(1e9 * random.uniform());
  const struck = (size: number) =>
    simulateTimedArrivals(
      model,
      { days, walks, uncertaintyUs, happening: spinUp(frequencyHz, epochDays, size) },
      dice(noiseSeed),
    ).map((arrival, i) => (i % 3 < receivers - 1 ? { ...arrival, receiver: 'second' } : arrival));
  const watch = startWatch(model, detectorSettings(1, 100));
  for (const arrival of struck(0).slice(0, past)) advance(watch, arrival);
  const { deltaNuOverNu90, delayDays90 } = detectionLimit(watch);
  if (deltaNuOverNu90 === null || delayDays90 === null) return null;
  if (watch.tracks.some((t) => t.state !== 'withdrawn')) return null;
  const arrivals = struck(deltaNuOverNu90);
  for (let i = past; i < days.length && days[i]! - epochDays <= delayDays90; i++) {
    advance(watch, arrivals[i]!);
    if (confirmsGlitch(watch)) return { delayDays: delayDays90, confirmed: true };
  }
  return { delayDays: delayDays90, confirmed: false };
}

function confirmsGlitch(watch: PulsarWatch): boolean {
  return watch.tracks.some((t) => t.state === 'confirmed' && t.kind === 'glitch');
}

interface Kind {
  readonly cadence: string;
  readonly noise: string;
  readonly receivers: number;
}

interface Cell extends Kind {
  readonly trials: number;
  readonly confirmed: number;
  readonly medianDelayDays: number;
}

function cell(kind: Kind, first: number): Cell {
  const trials: Trial[] = [];
  for (let n = 0; n < perCell; n++) {
    const done = trial(dice(first + n * STRIDE), kind);
    if (done !== null) trials.push(done);
  }
  const delays = trials.map((t) => t.delayDays).sort((a, b) => a - b);
  return {
    ...kind,
    trials: trials.length,
    confirmed: trials.filter((t) => t.confirmed).length,
    medianDelayDays: Math.round(delays[delays.length >> 1] ?? 0),
  };
}

const cells: Cell[] = [];
for (const cadence of Object.keys(CADENCES).filter((name) => only === '' || name === only))
  for (const noise of NOISES) {
    const receivers = noise === 'white' && (cadence === '3-day' || cadence === 'weekly') ? [1, 2] : [1];
    for (const count of receivers) {
      const kind = { cadence, noise, receivers: count };
      cells.push(cell(kind, seed + 1000 * cells.length));
      console.log(JSON.stringify(cells.at(-1)));
      keep(cells);
    }
  }

/** As JSON, and as a table for people. */
function keep(done: readonly Cell[]): void {
  const trials = done.reduce((sum, c) => sum + c.trials, 0);
  const confirmed = done.reduce((sum, c) => sum + c.confirmed, 0);
  const percent = (n: number, of: number) => (100 * (n / of)).toFixed(1);
  const date = new Date().toISOString().slice(0, 10);
  writeFileSync(
    new URL('limits.json', import.meta.url),
    `${JSON.stringify({ date, seed, perCell, trials, confirmed, cells: done }, null, 2)}\n`,
  );
  const rows = done.map(
    (c) =>
      `| ${c.cadence} | ${c.noise} | ${c.receivers} | ${c.trials} | ${percent(c.confirmed, c.trials)} | ${c.medianDelayDays} |`,
  );
  const table = [
    `# Stated 90 % limits against injected glitches, ${date}`,
    '',
    `Seed ${seed}. Glitches of just the stated size, at random times, in pulsars whose noise the detector had learned; confirmed within the stated delay: ${percent(confirmed, trials)} % of ${trials}.`,
    '',
    '| cadence | noise | receivers | glitches | confirmed, % | median stated delay, d |',
    '| --- | --- | --: | --: | --: | --: |',
    ...rows,
    '',
  ].join('\n');
  writeFileSync(new URL('limits.md', import.meta.url), table);
}
