// A burst of small files into a running daemon while its page is asked:  npx tsx test/studies/burst.ts [FILES]
// Everything in temporary folders and on loopback; the daemon is the program from its sources, in a process of its own. Writes what it found beside itself.
import { renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { createObservatory, digestFarAway } from '../support/observatory.ts';
import { arrivalFile, type SyntheticPulsar, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';
import { ask, asReader, spread, startWatch } from '../support/watchProcess.ts';

const files = Number(process.argv[2] ?? 50_000);
const BURST_PULSARS = 200;
const START_MJD = 58_000;
const LONGEST_MS = 3 * 3_600_000;
const PAGES = ['/', '/pulsars', '/feeds', '/mail', '/health'];

const pulsarNamed = (i: number): SyntheticPulsar =>
  syntheticPulsar({ name: `KR ${String(i).padStart(4, '0')}+31`, epochMjd: START_MJD, frequencyHz: 1 + i / 997 });

/** One arrival a file, all dropped at once. */
async function burst() {
  const pulsars = Array.from({ length: BURST_PULSARS }, (_, i) => pulsarNamed(i));
  const observatory = await createObservatory({ pulsars, digestCron: digestFarAway() });
  const each = Math.ceil(files / BURST_PULSARS);
  const contents = pulsars
    .flatMap((pulsar, i) =>
      syntheticArrivals(pulsar, { fromMjd: START_MJD + 1, toMjd: START_MJD + 3 * each, everyDays: 3, seed: i })
        .slice(0, each)
        .map((arrival) => arrivalFile([arrival])),
    )
    .slice(0, files);
  const staging = join(observatory.folder, 'staging');
  for (const [i, content] of contents.entries()) writeFileSync(join(staging, `${i}.csv`), content);
  const watch = await startWatch(observatory);
  try {
    const begunMs = performance.now();
    for (const i of contents.keys()) renameSync(join(staging, `${i}.csv`), join(observatory.feedFolder, `${i}.csv`));
    const droppedInS = (performance.now() - begunMs) / 1000;
    const taking: number[] = [];
    let onRecord = 0;
    while (onRecord < contents.length && performance.now() - begunMs < LONGEST_MS) {
      taking.push(await ask(watch.url + PAGES[taking.length % PAGES.length]));
      if (taking.length % 10 === 0) onRecord = asReader(observatory, (store) => store.counts().files);
      await pause(200);
    }
    const takenInS = (performance.now() - begunMs) / 1000;
    const deciding: number[] = [];
    while (asReader(observatory, (store) => store.pulsarReports().length) < BURST_PULSARS) {
      if (performance.now() - begunMs > LONGEST_MS) break;
      deciding.push(await ask(watch.url));
      await pause(200);
    }
    const { arrivals, problems } = asReader(observatory, (store) => ({
      arrivals: store.counts().arrivals,
      problems: store.verify(),
    }));
    const decided = asReader(observatory, (store) => store.pulsarReports().length);
    return {
      files: contents.length,
      droppedInS: Math.round(droppedInS),
      takenInS: Math.round(takenInS),
      arrivalsOnRecord: arrivals,
      problems,
      pageWhileTakenIn: spread(taking),
      pageWhileDecided: { pulsars: decided, ...spread(deciding) },
      residentMb: watch.residentMb(),
    };
  } finally {
    await watch.stop();
    await observatory.remove();
  }
}

const result = { date: new Date().toISOString().slice(0, 10), ...(await burst()) };
writeFileSync(new URL('burst.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(JSON.stringify(result, null, 2));
