import { type BarycentredArrival, emissionTdb, type TimedArrival } from '../../detectors/arrival.ts';
import type { PulsarReport } from '../../detectors/report.ts';
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
  received: Omit<TimedArrival, 'key' | 'tdb'>,
  barycentred: Pick<BarycentredArrival, 'tdb' | 'delays'>,
): TimedArrival {
  const { uncertaintyUs, frequencyMhz, site, receiver, pulseNumber } = received;
  return { key, tdb: emissionTdb(barycentred), uncertaintyUs, frequencyMhz, site, receiver, pulseNumber };
}

/** Follows one pulsar's phase through its log: what the detector says about it alone. */
export function followPulsar(
  station: Station,
  watches: PulsarWatches,
  pulsar: string,
  changes: LogChanges,
): PulsarReport {
  const model = station.configuration.models.get(pulsar);
  if (model === undefined) throw new Error(`${pulsar} has no model in ${station.configuration.modelsFolder}`);
  return watches.report(model, station.settingsOf(model), liveLog(station, pulsar, changes));
}
