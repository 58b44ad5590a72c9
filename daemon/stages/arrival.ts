import type { BarycentredArrival, ReceivedArrival } from '../../detectors/arrival.ts';
import { barycentre } from '../../detectors/sky/barycentre.ts';
import type { ArrivalRecord } from '../records.ts';
import type { Station } from '../station.ts';
import type { NewArrival, RetimedArrival } from '../store/index.ts';

type Timing = Pick<NewArrival, 'barycentred' | 'quality' | 'qualityReasons'>;

/** An arrival as received → at the barycentre. One that no table covers is kept without a time, and timed when a table does. */
export function bringToBarycentre(station: Station, received: ReceivedArrival): Timing {
  const model = station.configuration.models.get(received.pulsar);
  if (model === undefined) throw new Error(`${received.pulsar} has no model; its rows should have been quarantined`);
  const arrival: BarycentredArrival = barycentre(
    received,
    model,
    station.sites.get(received.site) ?? null,
    station.tablesOf(model),
  );
  const { quality, qualityReasons } = arrival;
  return { barycentred: quality === 'unusable' ? null : arrival, quality, qualityReasons };
}

/** Those of the recorded arrivals that come out at another time with the tables and models of now. */
export function retime(station: Station, recorded: readonly ArrivalRecord[]): readonly RetimedArrival[] {
  return recorded.flatMap((record) => {
    const now = bringToBarycentre(station, record);
    return sameTiming(record, now) ? [] : [{ key: record.key, ...now }];
  });
}

function sameTiming(record: ArrivalRecord, now: Timing): boolean {
  const before = { tdb: record.tdb, delays: record.delays, quality: record.quality, reasons: record.qualityReasons };
  const after = {
    tdb: now.barycentred?.tdb ?? null,
    delays: now.barycentred?.delays ?? null,
    quality: now.quality,
    reasons: now.qualityReasons,
  };
  return JSON.stringify(sorted(before)) === JSON.stringify(sorted(after));
}

/** Plain data with its keys in one order; −0, which the record does not keep apart from 0, becomes 0. */
function sorted(value: unknown): unknown {
  if (Array.isArray(value)) return value.map(sorted);
  if (value === null || typeof value !== 'object') return value;
  return Object.fromEntries(
    Object.entries(value)
      .sort(([a], [b]) => (a < b ? -1 : 1))
      .map(([key, inner]) => [key, sorted(inner)]),
  );
}
