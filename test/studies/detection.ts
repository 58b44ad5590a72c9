// Delay of confirmation against the smallest that is possible:  npm run study:detection -- [SEED] [TRIALS PER CELL] [THREADS]
// Programmes by history, cadence, noise and size; the detector learns the noise from the arrivals before the glitch, the clairvoyant
// test (test/support/clairvoyant.ts) is told everything but the epoch. Both get the same arrivals, at the same rate of false alarms.
// Writes a table and a picture beside itself.
import { writeFileSync } from 'node:fs';
import { isMainThread, parentPort, Worker } from 'node:worker_threads';
import { detectionPicture } from '../support/detectionPicture.ts';
import { detectionMarkdown, detectionResult } from '../support/detectionTable.ts';
import {
  CADENCES,
  type Cell,
  detectionTrial,
  EXPECTED,
  falseAlarmRate,
  HISTORIES,
  NOISES,
  type Trial,
} from '../support/detectionTrial.ts';

/** Primes apart, so that neighbouring pulsars do not begin alike. */
const STRIDE = 7919;
const NULL_PULSARS = 120;

/** A task of a worker: a trial, or the rate of false alarms at which the trials of a cadence and noise are held. */
type Task =
  | { readonly kind: 'rate'; readonly seed: number; readonly cell: Cell }
  | { readonly kind: 'trial'; readonly seed: number; readonly cell: Cell; readonly falseAlarmsPerYear: number };

function work(task: Task): Trial | number {
  return task.kind === 'rate'
    ? falseAlarmRate(task.seed, task.cell, NULL_PULSARS)
    : detectionTrial(task.seed, task.cell, task.falseAlarmsPerYear);
}

async function study(seed: number, perCell: number, threads: number): Promise<void> {
  const places = HISTORIES.flatMap((history) =>
    CADENCES.flatMap((cadence) => NOISES.map((noise) => ({ history, cadence, noise, expected: EXPECTED[0] }))),
  );
  const rates = await inThreads<number>(
    threads,
    places.map((cell, k) => ({ kind: 'rate', seed: seed + k * STRIDE, cell })),
  );
  const tasks = places.flatMap((place, k) =>
    EXPECTED.flatMap((expected) =>
      Array.from({ length: perCell }, (): Omit<Task & { kind: 'trial' }, 'seed'> => {
        return { kind: 'trial', cell: { ...place, expected }, falseAlarmsPerYear: rates[k]! };
      }),
    ),
  );
  const numbered = tasks.map((task, n) => ({ ...task, seed: seed + (n + places.length) * STRIDE }));
  const trials = await inThreads<Trial>(threads, numbered);
  const falseAlarms = places.map(({ history, cadence, noise }, k) => ({ history, cadence, noise, perYear: rates[k]! }));
  const head = { date: new Date().toISOString().slice(0, 10), seed, perCell };
  const result = detectionResult(head, trials, falseAlarms);
  const write = (name: string, text: string) => writeFileSync(new URL(name, import.meta.url), text);
  write('detection.json', `${JSON.stringify({ ...result, trials }, null, 1)}\n`);
  write('detection.md', detectionMarkdown(result));
  write('detection.svg', detectionPicture(result));
  console.log(detectionMarkdown(result));
}

/** A thread reads TypeScript only once it has been told how. */
const START = `import('${import.meta.resolve('tsx/esm/api')}').then(({ register }) => {
  register();
  return import('${import.meta.url}');
});`;

/** The results in the order of the tasks, however many threads there are. */
function inThreads<T>(threads: number, tasks: readonly Task[]): Promise<T[]> {
  const results: T[] = new Array(tasks.length);
  let next = 0;
  const one = () =>
    new Promise<void>((done, failed) => {
      const worker = new Worker(START, { eval: true });
      const hand = () => {
        if (next >= tasks.length) {
          void worker.terminate().then(() => done());
          return;
        }
        const at = next++;
        worker.postMessage({ at, task: tasks[at] });
      };
      worker.on('message', ({ at, result }: { at: number; result: T }) => {
        results[at] = result;
        hand();
      });
      worker.on('error', failed);
      hand();
    });
  return Promise.all(Array.from({ length: threads }, one)).then(() => results);
}

if (isMainThread)
  await study(Number(process.argv[2] ?? 2026), Number(process.argv[3] ?? 10), Number(process.argv[4] ?? 2));
else
  parentPort!.on('message', ({ at, task }: { at: number; task: Task }) =>
    parentPort!.postMessage({ at, result: work(task) }),
  );
