// A daemon that starts on a large record, and a new file into it:  npx tsx test/studies/largeRecord.ts [PULSARS] [ARRIVALS A PULSAR] [STATE FOLDER]
// The record is filled directly, as the pipeline would leave it, in a temporary folder, or in STATE FOLDER, which is kept and used again the same day.
// The daemon is the program from its sources, in a process of its own. Writes what it found beside itself.
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { setTimeout as pause } from 'node:timers/promises';
import { systemClock } from '../../daemon/clock.ts';
import { silentLog } from '../../daemon/log.ts';
import { loadOrders } from '../../daemon/opening.ts';
import { reportRow } from '../../daemon/stages/decision.ts';
import { createStation } from '../../daemon/station.ts';
import { emptyBatch, type NewArrival, openStore, type PulsarReportRow } from '../../daemon/store/index.ts';
import { loadTables } from '../../daemon/tables/loadTables.ts';
import { advance, startWatch as followPulsar, pulsarTimes, report } from '../../detectors/index.ts';
import { createObservatory, digestFarAway, type TestObservatory } from '../support/observatory.ts';
import { dice } from '../support/simulatedPulsar.ts';
import {
  arrivalFile,
  type SyntheticArrival,
  type SyntheticPulsar,
  syntheticArrivals,
  syntheticPulsar,
} from '../support/syntheticPulsar.ts';
import { ask, asReader, spread, startWatch, type WatchProcess } from '../support/watchProcess.ts';

const manyPulsars = Number(process.argv[2] ?? 1000);
const arrivalsEach = Number(process.argv[3] ?? 5000);
const keptFolder = process.argv[4];
const TODAY_MJD = Math.floor(40_587 + Date.now() / 86_400_000);
const START_MJD = TODAY_MJD - arrivalsEach - 1;
/** Every third pulsar has not been seen for so long: the morning review looks into its cadence. */
const SILENT_DAYS = 30;
const PAGES = ['/', '/pulsars', '/feeds', '/mail', '/health', '/metrics', '/healthz'];
const PATIENCE_MS = 1_800_000;

const pulsarNamed = (i: number): SyntheticPulsar =>
  syntheticPulsar({ name: `KR ${String(i).padStart(4, '0')}+31`, epochMjd: START_MJD });
const newcomer = syntheticPulsar({
  name: 'KR 9999+31',
  epochMjd: TODAY_MJD - 80,
  glitches: [{ mjd: TODAY_MJD - 12, deltaNuOverNu: 2e-7 }],
});
/** Of one pulsar; the others have the same under their own names. */
const arrivals = syntheticArrivals(pulsarNamed(0), { fromMjd: START_MJD, toMjd: TODAY_MJD - 2, everyDays: 1, seed: 5 });

async function prepared(): Promise<TestObservatory> {
  const pulsars = [...Array(manyPulsars).keys()].map(pulsarNamed);
  const observatory = await createObservatory({ pulsars: [...pulsars, newcomer], digestCron: digestFarAway() });
  if (keptFolder === undefined) return observatory;
  const text = readFileSync(observatory.configFile, 'utf8');
  writeFileSync(observatory.configFile, text.replace('folder = "state"', `folder = ${JSON.stringify(keptFolder)}`));
  return { ...observatory, stateFolder: keptFolder };
}

/** Every report is that of one pulsar that was really followed, under another name. */
function fill({ stateFolder, configFile }: TestObservatory): void {
  mkdirSync(stateFolder, { mode: 0o700 });
  const opened = openStore(stateFolder, { mode: 'daemon' });
  if (!opened.ok) throw new Error(opened.failure.message);
  const { store } = opened;
  const { configuration } = loadOrders(configFile);
  const { tables } = loadTables();
  const station = createStation({
    configuration,
    store,
    tables,
    clock: systemClock,
    log: silentLog(),
    reviewUrl: () => null,
  });
  const model = (i: number) => configuration.models.get(pulsarNamed(i).name)!;
  const watch = followPulsar(model(0), station.settingsOf(model(0)));
  for (const [n, arrival] of arrivals.entries())
    advance(watch, { ...recorded(arrival, n).received, ...timed(arrival, n) });
  const sample = { ...reportRow(station, report(watch)), times: pulsarTimes(watch) };
  for (let i = 0; i < manyPulsars; i++) {
    const { name: pulsar } = pulsarNamed(i);
    const mine = (i % 3 === 0 ? arrivals.slice(0, -SILENT_DAYS) : arrivals).map((one, n) =>
      recorded({ ...one, pulsar }, n),
    );
    const path = `${i}.csv`;
    const unread = { feed: 'nightly', path, sha256: path.padEnd(64, '0'), bytes: 1, signature: path };
    const random = dice(i);
    const times = {
      ...sample.times,
      pulsar,
      // Noise of its own: what all pulsars had in common would be taken for the clock of their site.
      sessions: sample.times.sessions.map((session) => ({
        ...session,
        deviationTurns: Math.sqrt(session.varianceTurns2) * random.normal(),
      })),
    };
    const row: PulsarReportRow = { ...sample, pulsar, basis: station.basisOf(model(i)), times };
    const at = new Date(Date.now() - 1000).toISOString();
    store.commitIntake({
      ...emptyBatch(at),
      file: { ...unread, rows: mine.length, fault: null },
      arrivals: mine,
      reports: [row],
    });
  }
  store.close();
}

function tdbOf({ mjdText }: SyntheticArrival): { readonly day: number; readonly fraction: number } {
  const [day = '', fraction = ''] = mjdText.split('.');
  return { day: Number(day), fraction: Number(`0.${fraction}`) };
}

const timed = (arrival: SyntheticArrival, n: number) => ({ key: `${arrival.pulsar} ${n}`, tdb: tdbOf(arrival) });

function recorded(arrival: SyntheticArrival, n: number): NewArrival {
  const { key, tdb } = timed(arrival, n);
  const fair = { quality: 'ok', qualityReasons: [] } as const;
  return {
    key,
    line: n + 2,
    received: {
      pulsar: arrival.pulsar,
      timeText: arrival.mjdText,
      timeScale: 'TDB',
      time: tdb,
      uncertaintyUs: arrival.uncertaintyUs,
      frequencyMhz: Number.POSITIVE_INFINITY,
      site: 'barycentre',
      receiver: '',
      pulseNumber: null,
      signalToNoise: null,
      note: null,
    },
    barycentred: {
      tdb,
      delays: { clockS: 0, tdbMinusTtS: 0, roemerS: 0, shapiroS: 0, dispersionS: 0, orbitS: 0 },
      ...fair,
    },
    ...fair,
    revises: null,
  };
}

async function pageTimes(watch: WatchProcess, pages: readonly string[]) {
  const found: Record<string, ReturnType<typeof spread>> = {};
  for (const page of pages) {
    const times: number[] = [];
    for (let n = 0; n < 5; n++) times.push(await ask(watch.url + page));
    found[page] = spread(times);
  }
  return found;
}

/** What comes in is decided about; the page is asked meanwhile. */
async function whileDecided(watch: WatchProcess, isDecided: () => boolean) {
  const begunMs = performance.now();
  const times: number[] = [];
  while (!isDecided()) {
    if (performance.now() - begunMs > PATIENCE_MS) throw new Error('not decided within half an hour');
    times.push(await ask(`${watch.url}/`));
    await pause(100);
  }
  return { seconds: Math.round((performance.now() - begunMs) / 100) / 10, page: spread(times) };
}

async function measured(observatory: TestObservatory, watch: WatchProcess) {
  const residentAtStartMb = watch.residentMb();
  const pages = await pageTimes(watch, PAGES);

  const eventOf = (pulsar: string) => asReader(observatory, (store) => store.events({ pulsar })[0]?.event.id ?? null);
  const span = { fromMjd: newcomer.epochMjd + 1, toMjd: TODAY_MJD - 2, everyDays: 3, seed: 7 };
  await observatory.drop('newcomer.csv', arrivalFile(syntheticArrivals(newcomer, span)));
  const newEvent = await whileDecided(watch, () => eventOf(newcomer.name) !== null);
  const eventPage = `/events/${encodeURIComponent(eventOf(newcomer.name)!)}`;
  Object.assign(pages, { event: (await pageTimes(watch, [eventPage]))[eventPage] });

  const { name } = pulsarNamed(1);
  const decidedOn = () => asReader(observatory, (store) => store.pulsarReport(name)!.arrivals!);
  const before = decidedOn();
  const lastNight = { fromMjd: TODAY_MJD - 1, toMjd: TODAY_MJD - 1, everyDays: 1, seed: Date.now() % 1e6 };
  await observatory.drop('night.csv', arrivalFile(syntheticArrivals(pulsarNamed(1), lastNight)));
  const newArrival = await whileDecided(watch, () => decidedOn() > before);
  return { residentAtStartMb, residentMb: watch.residentMb(), pages, newEvent, newArrival };
}

const observatory = await prepared();
const fillsMs = performance.now();
if (!existsSync(observatory.stateFolder)) fill(observatory);
const filledInS = Math.round((performance.now() - fillsMs) / 1000);
const { bytes, arrivals: onRecord } = asReader(observatory, (store) => store.counts());
const watch = await startWatch(observatory);
try {
  const result = {
    date: new Date().toISOString().slice(0, 10),
    pulsars: manyPulsars,
    arrivals: onRecord,
    recordMb: Math.round(bytes / 1e6),
    filledInS,
    startedInS: watch.startedInS,
    ...(await measured(observatory, watch)),
  };
  writeFileSync(new URL('largeRecord.json', import.meta.url), `${JSON.stringify(result, null, 2)}\n`);
  console.log(JSON.stringify(result, null, 2));
} finally {
  await watch.stop();
  await observatory.remove();
}
