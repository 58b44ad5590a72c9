import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { composeEventMail, type DeliveryOutcome, messageId, type PlannedMessage } from '../alerts/index.ts';
import type { TimedArrival } from '../detectors/arrival.ts';
import { siteSteps } from '../detectors/index.ts';
import type { PulsarReport } from '../detectors/report.ts';
import type { KnownGlitch, PulsarModel } from '../detectors/spin/pulsarModel.ts';
import { withGlitch } from '../detectors/spin/syntheticGlitch.ts';
import type { PulsarEvent } from '../detectors/steps/pulsarEvent.ts';
import { mjdNumber } from '../detectors/time/mjd.ts';
import { mailerFor } from './mailerFor.ts';
import { failed } from './opening.ts';
import { consequencesOf } from './stages/consequences.ts';
import { reportRow } from './stages/decision.ts';
import { liveLog, modelInUse } from './stages/deviation.ts';
import { PulsarWatches } from './stages/pulsarWatches.ts';
import { mailSetting, type Station } from './station.ts';
import { emptyBatch, openStore, type Store } from './store/index.ts';

/**
 * A rehearsal: a synthetic glitch in a copy of a pulsar's own arrivals, through detector, event, notice and mail, on a record of its
 * own that is thrown away. The real record is only read.
 */
export interface Drill {
  readonly pulsar: string;
  readonly injected: KnownGlitch;
  /** What the detector made of it, under an id that says DRILL; null: nothing. */
  readonly event: PulsarEvent | null;
  readonly suspected: Delay | null;
  readonly confirmed: Delay | null;
  /** Empty where it was not confirmed: nobody would have been told. */
  readonly mail: readonly {
    readonly recipient: string;
    readonly state: DeliveryOutcome['state'];
    readonly detail: string;
  }[];
}

/** How long it took from the glitch. */
export interface Delay {
  readonly mjd: number;
  readonly days: number;
  readonly arrivals: number;
}

const NO_CHANGES = { arrivals: [], statusChanges: [], retimed: [] };
/** The detector needs a locked count before anything can happen. */
const ARRIVALS_BEFORE = 12;
/** An epoch that is found so far from the injected one is another event, days beyond its 95 % interval. */
const SLACK_DAYS = 3;

/** The live arrivals of the pulsar, as the detector sees them. */
export function drillLog(station: Station, model: PulsarModel): readonly TimedArrival[] {
  return liveLog(station, model.name, NO_CHANGES);
}

/** Why no glitch can be injected at this date; null: one can. */
export function epochProblem(log: readonly TimedArrival[], epochMjd: number): string | null {
  const before = log.filter(({ tdb }) => mjdNumber(tdb) < epochMjd).length;
  const [first, last] = [log[0], log.at(-1)];
  if (first === undefined || last === undefined) return 'it has no arrivals on record';
  const span = `its ${log.length} arrivals are from MJD ${mjdNumber(first.tdb).toFixed(2)} to ${mjdNumber(last.tdb).toFixed(2)}`;
  if (before < ARRIVALS_BEFORE)
    return `there are ${before} arrivals before MJD ${epochMjd.toFixed(2)} and ${ARRIVALS_BEFORE} are needed; ${span}`;
  return before === log.length ? `there is no arrival after MJD ${epochMjd.toFixed(2)}; ${span}` : null;
}

export async function runDrill(
  station: Station,
  model: PulsarModel,
  { injected, recipients }: { readonly injected: KnownGlitch; readonly recipients: readonly string[] },
): Promise<Drill> {
  const log = drillLog(station, model);
  const drilled = withGlitch(log, model, injected);
  const report = marked(
    new PulsarWatches().report(modelInUse(station, model.name), station.settingsOf(model), drilled),
    station.clock.now(),
  );
  const scratch = await mkdtemp(join(tmpdir(), 'spinvigil-drill-'));
  try {
    const opened = openStore(scratch, { mode: 'daemon' });
    if (!opened.ok) throw failed(opened.failure);
    try {
      const found = await eventOnScratch(station, opened.store, report, injected);
      const delay = (mjd: number | null) => (mjd === null ? null : delayOf(log, injected, mjd));
      const confirmed = found?.state === 'confirmed' ? delay(found.confirmedAtMjd) : null;
      const mail =
        found === null || confirmed === null ? [] : await mailDrill(station, opened.store, found, model, recipients);
      const suspected = delay(found?.suspectedAtMjd ?? null);
      return { pulsar: model.name, injected, event: found, suspected, confirmed, mail };
    } finally {
      opened.store.close();
    }
  } finally {
    await rm(scratch, { recursive: true, force: true });
  }
}

/** The later stages as in life, beside what is on record of the other pulsars, written to the scratch record. */
async function eventOnScratch(
  station: Station,
  store: Store,
  report: PulsarReport,
  injected: KnownGlitch,
): Promise<PulsarEvent | null> {
  const others = station.store.pulsarReports().filter(({ pulsar }) => pulsar !== report.pulsar);
  const rows = [...others, reportRow(station, report)];
  const steps = siteSteps(station.store.pulsarTimes());
  const scratch = { ...station, store };
  const consequences = await consequencesOf(scratch, { reports: [report], rows, steps }, { mail: false });
  store.commitIntake({ ...emptyBatch(station.clock.now().toISOString()), ...consequences });
  const epochMjd = mjdNumber(injected.epochTdb);
  const near = store
    .events({ pulsar: report.pulsar })
    .map(({ event }) => event)
    .filter(
      ({ epochInterval95: [low, high], state }) =>
        state !== 'withdrawn' && low - SLACK_DAYS <= epochMjd && epochMjd <= high + SLACK_DAYS,
    );
  const distance = (event: PulsarEvent) => Math.abs(event.epochMjd - epochMjd);
  return near.sort((a, b) => rank(a) - rank(b) || distance(a) - distance(b))[0] ?? null;
}

/** A confirmed event is the answer before a suspected one. */
function rank({ state }: PulsarEvent): number {
  return state === 'confirmed' ? 0 : 1;
}

function delayOf(log: readonly TimedArrival[], { epochTdb }: KnownGlitch, mjd: number): Delay {
  const epoch = mjdNumber(epochTdb);
  const between = log.filter(({ tdb }) => mjdNumber(tdb) > epoch && mjdNumber(tdb) <= mjd + 1e-6);
  return { mjd, days: mjd - epoch, arrivals: between.length };
}

/** Sends at once, past the outbox: whoever rehearses waits for the outcome. */
async function mailDrill(
  station: Station,
  store: Store,
  event: PulsarEvent,
  model: PulsarModel,
  recipients: readonly string[],
): Promise<Drill['mail']> {
  const { configuration } = station;
  const { contact } = configuration.observatory;
  const about = { eventId: event.id, revision: 1, kind: 'drill' } as const;
  const planned: PlannedMessage = {
    ...about,
    reason: 'first confirmation',
    messageId: messageId({ ...about, contact }),
    inReplyTo: null,
    recipients,
  };
  // No link: the page knows nothing of a drill.
  const setting = { ...mailSetting(station), reviewUrl: null };
  const picture = store.event(event.id)?.picture ?? null;
  const { mime } = await composeEventMail({ event, picture, model, planned, toldRevision: null }, setting);
  const mailer = mailerFor(configuration.mail);
  const sent: Drill['mail'][number][] = [];
  for (const recipient of recipients) {
    const { state, detail } = await mailer.send({ from: configuration.mail.from, recipient, mime });
    sent.push({ recipient, state, detail });
  }
  return sent;
}

/** No notice, file or message of a drill bears the name of a real event; each drill has its own. */
function marked(report: PulsarReport, at: Date): PulsarReport {
  const name = (id: string) => `DRILL-${at.toISOString().replace(/[-:.]/g, '')}-${id}`;
  return {
    ...report,
    events: report.events.map((event) => ({ ...event, id: name(event.id) })),
    pictures: new Map([...report.pictures].map(([id, picture]) => [name(id), picture])),
  };
}
