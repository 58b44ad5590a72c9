// A burst of small files into a running daemon while its page is asked, and a daemon that starts on a large record:
//   npx tsx test/studies/burst.ts [FILES] [PULSARS] [ARRIVALS A PULSAR]
// Everything in temporary folders and on loopback; the daemon is the program from its sources, in a process of its own. Writes what it found beside itself.
import { type ChildProcess, spawn } from 'node:child_process';
import { mkdirSync, readFileSync, renameSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { systemClock } from '../../daemon/clock.ts';
import { silentLog } from '../../daemon/log.ts';
import { loadOrders } from '../../daemon/opening.ts';
import { createStation } from '../../daemon/station.ts';
import { emptyBatch, type NewArrival, openStore, type Store } from '../../daemon/store/index.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import { createObservatory, digestFarAway, type TestObservatory } from '../support/observatory.ts';
import { ROOT } from '../support/sourceTree.ts';
import { arrivalFile, type SyntheticPulsar, syntheticArrivals, syntheticPulsar } from '../support/syntheticPulsar.ts';

const files = Number(process.argv[2] ?? 50_000);
const manyPulsars = Number(process.argv[3] ?? 1000);
const arrivalsEach = Number(process.argv[4] ?? 5000);
const BURST_PULSARS = 200;
const START_MJD = 58_000;
const LONGEST_MS = 3 * 3_600_000;
const PAGES = ['/', '/pulsars', '/feeds', '/mail', '/health'];

const pulsarNamed = (i: number): SyntheticPulsar =>
  syntheticPulsar({ name: `KR ${String(i).padStart(4, '0')}+31`, epochMjd: START_MJD, frequencyHz: 1 + i / 997 });

interface Watch {
  readonly url: string;
  readonly startedInS: number;
  residentMb(): number;
  stop(): Promise<void>;
}

async function startWatch(observatory: TestObservatory): Promise<Watch> {
  const begunMs = performance.now();
  const child: ChildProcess = spawn(
    process.execPath,
    ['--import', 'tsx', join(ROOT, 'daemon/cli.ts'), 'watch', '--config', observatory.configFile],
    { cwd: ROOT, stdio: ['ignore', 'pipe', 'ignore'] },
  );
  let said = '';
  child.stdout?.on('data', (chunk) => (said += chunk));
  const ended = new Promise<void>((resolve) => child.once('exit', () => resolve()));
  for (;;) {
    const url = /review page: (\S+)/.exec(said)?.[1];
    if (url !== undefined) {
      return {
        url: url.replace(/\/$/, ''),
        startedInS: (performance.now() - begunMs) / 1000,
        residentMb: () => Number(/VmRSS:\s+(\d+)/.exec(readFileSync(`/proc/${child.pid}/status`, 'utf8'))?.[1]) / 1000,
        async stop() {
          child.kill('SIGTERM');
          await ended;
        },
      };
    }
    if (child.exitCode !== null) throw new Error(`the daemon ended with ${child.exitCode}`);
    await pause(50);
  }
}

async function ask(url: string): Promise<number> {
  const begunMs = performance.now();
  const answer = await fetch(url);
  await answer.arrayBuffer();
  if (!answer.ok) throw new Error(`${url}: ${answer.status}`);
  return performance.now() - begunMs;
}

function asReader<Result>({ stateFolder }: TestObservatory, look: (store: Store) => Result): Result {
  const opened = openStore(stateFolder, { mode: 'reader' });
  if (!opened.ok) throw new Error(opened.failure.message);
  try {
    return look(opened.store);
  } finally {
    opened.store.close();
  }
}

function spread(ms: readonly number[]) {
  const sorted = [...ms].sort((a, b) => a - b);
  const at = (share: number) => Math.round(sorted[Math.min(sorted.length - 1, Math.floor(share * sorted.length))] ?? 0);
  const within = sorted.filter((one) => one < 1000).length;
  return { asked: sorted.length, medianMs: at(0.5), ms99: at(0.99), longestMs: at(1), withinASecond: within };
}

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
      residentMb: Math.round(watch.residentMb()),
    };
  } finally {
    await watch.stop();
    await observatory.remove();
  }
}

/** The record is filled directly, as the pipeline would leave it, and the daemon started on it. */
async function largeRecord() {
  const observatory = await createObservatory({ pulsars: [pulsarNamed(0)], digestCron: digestFarAway() });
  for (let i = 1; i < manyPulsars; i++) await observatory.addModel({ ...pulsarNamed(i), name: pulsarNamed(i).name });
  mkdirSync(observatory.stateFolder, { mode: 0o700 });
  const begunMs = performance.now();
  fill(observatory);
  const filledInS = Math.round((performance.now() - begunMs) / 1000);
  const watch = await startWatch(observatory);
  try {
    const pages: Record<string, ReturnType<typeof spread>> = {};
    for (const page of [...PAGES, '/morning']) {
      const times: number[] = [];
      for (let n = 0; n < 5; n++) times.push(await ask(watch.url + page).catch(() => Number.NaN));
      if (times.every(Number.isFinite)) pages[page] = spread(times);
    }
    const { counts } = asReader(observatory, (store) => ({ counts: store.counts() }));
    const residentMb = Math.round(watch.residentMb());
    const recordMb = Math.round(counts.bytes / 1e6);
    return {
      pulsars: manyPulsars,
      arrivals: counts.arrivals,
      recordMb,
      filledInS,
      startedInS: watch.startedInS,
      residentMb,
      pages,
    };
  } finally {
    await watch.stop();
    await observatory.remove();
  }
}

/** As the daemon will find it: otherwise everything would be decided anew, which is not what is measured here. */
function basisOf(configFile: string, store: Store): (pulsar: string) => string {
  const { configuration } = loadOrders(configFile);
  const { tables } = loadTables();
  const parts = { configuration, store, tables, clock: systemClock, log: silentLog(), reviewUrl: () => null };
  const station = createStation(parts);
  return (pulsar) => station.basisOf(configuration.models.get(pulsar)!);
}

function fill({ stateFolder, configFile }: TestObservatory): void {
  const opened = openStore(stateFolder, { mode: 'daemon' });
  if (!opened.ok) throw new Error(opened.failure.message);
  const { store } = opened;
  const basis = basisOf(configFile, store);
  for (let i = 0; i < manyPulsars; i++) {
    const { name: pulsar } = pulsarNamed(i);
    const at = new Date(Date.now() - 1000).toISOString();
    const arrivals = Array.from({ length: arrivalsEach }, (_, n) => recordedArrival(pulsar, n));
    const path = `${i}.csv`;
    const file = {
      feed: 'nightly',
      path,
      sha256: path.padEnd(64, '0'),
      bytes: 1,
      signature: path,
      rows: arrivals.length,
      fault: null,
    };
    const report = {
      pulsar,
      basis: basis(pulsar),
      events: [],
      locked: true,
      noise: { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 },
      lastArrivalMjd: START_MJD + arrivalsEach,
      arrivals: arrivals.length,
    };
    store.commitIntake({ ...emptyBatch(at), file, arrivals, reports: [report] });
  }
  store.close();
}

function recordedArrival(pulsar: string, n: number): NewArrival {
  const time = { day: START_MJD + n, fraction: 0.125 };
  return {
    key: `${pulsar} ${n}`,
    line: n + 2,
    received: {
      pulsar,
      timeText: `${time.day}.125`,
      timeScale: 'TDB',
      time,
      uncertaintyUs: 50,
      frequencyMhz: Number.POSITIVE_INFINITY,
      site: 'barycentre',
      receiver: '',
      pulseNumber: null,
      signalToNoise: null,
      note: null,
    },
    barycentred: {
      tdb: time,
      delays: { clockS: 0, tdbMinusTtS: 0, roemerS: 0, shapiroS: 0, dispersionS: 0, orbitS: 0 },
      quality: 'ok',
      qualityReasons: [],
    },
    quality: 'ok',
    qualityReasons: [],
    revises: null,
  };
}

const result = { date: new Date().toISOString().slice(0, 10), burst: await burst(), largeRecord: await largeRecord() };
writeFileSync(new URL('burst.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
console.log(JSON.stringify(result, null, 2));
