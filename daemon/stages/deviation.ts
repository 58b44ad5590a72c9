import {
  type BarycentredArrival,
  emissionTdb,
  type ReceivedArrival,
  type TimedArrival,
} from '../../detectors/arrival.ts';
import type { SiteStep } from '../../detectors/index.ts';
import type { PulsarReport } from '../../detectors/report.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { mjdNumber } from '../../detectors/time/mjd.ts';
import type { ArrivalRecord } from '../records.ts';
import type { Station } from '../station.ts';
import type { IntakeBatch, RetimedArrival } from '../store/index.ts';
import { inTimeOrder, type PulsarWatches } from './pulsarWatches.ts';

/** What a batch would change of the arrival log, before it is written. */
export type LogChanges = Pick<IntakeBatch, 'arrivals' | 'statusChanges' | 'retimed'>;

/**
 * A pulsar's live arrivals at the barycentre in time order, as they will stand once `changes` are on record. Arrivals that no
 * table could time are not among them.
 */
export function liveLog(station: Station, pulsar: string, changes: LogChanges): readonly TimedArrival[] {
  const status = new Map(changes.statusChanges.map((change) => [change.key, change.status]));
  const retimed = new Map(changes.retimed.map((change) => [change.key, change]));
  const recorded = station.store
    .arrivals(pulsar)
    .filter((record) => (status.get(record.key) ?? record.status) === 'live')
    .flatMap((record) => timed(record, retimed.get(record.key)));
  const added = changes.arrivals
    .filter(({ key, received }) => received.pulsar === pulsar && (status.get(key) ?? 'live') === 'live')
    .flatMap(({ key, received, barycentred }) =>
      barycentred === null ? [] : [timedArrival(key, received, barycentred)],
    );
  return inTimeOrder([...recorded, ...added]);
}

function timed(record: ArrivalRecord, retimed: RetimedArrival | undefined): TimedArrival[] {
  const { tdb, delays } = retimed === undefined ? record : (retimed.barycentred ?? { tdb: null, delays: null });
  return tdb === null || delays === null ? [] : [timedArrival(record.key, record, { tdb, delays })];
}

function timedArrival(
  key: string,
  received: ReceivedArrival,
  barycentred: Pick<BarycentredArrival, 'tdb' | 'delays'>,
): TimedArrival {
  const { uncertaintyUs, frequencyMhz, site, receiver, pulseNumber, time, timeScale } = received;
  const siteMjd = timeScale === 'UTC' ? { siteMjd: mjdNumber(time) } : {};
  return { key, tdb: emissionTdb(barycentred), ...siteMjd, uncertaintyUs, frequencyMhz, site, receiver, pulseNumber };
}

/** A pulsar as the operator describes it. */
export function modelOf({ configuration }: Station, pulsar: string): PulsarModel {
  const model = configuration.models.get(pulsar);
  if (model === undefined) throw new Error(`${pulsar} has no model in ${configuration.modelsFolder}`);
  return model;
}

/** The same with the steps of its sites' clocks that are on record. */
export function modelInUse(station: Station, pulsar: string): PulsarModel {
  return withSiteSteps(modelOf(station, pulsar), station.store.pulsarReport(pulsar)?.siteSteps ?? []);
}

export function withSiteSteps(model: PulsarModel, siteSteps: readonly SiteStep[]): PulsarModel {
  return siteSteps.length === 0 ? model : { ...model, siteSteps };
}

/** Follows one pulsar's phase through its log: what the detector says about it alone, the steps of its sites on record known. */
export function followPulsar(
  station: Station,
  watches: PulsarWatches,
  pulsar: string,
  changes: LogChanges,
): PulsarReport {
  const model = modelInUse(station, pulsar);
  return watches.report(model, station.settingsOf(model), liveLog(station, pulsar, changes));
}
