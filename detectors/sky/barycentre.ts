import type { BarycentredArrival, Delays, ReceivedArrival } from '../arrival.ts';
import type { Orbit } from '../spin/orbitModel.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { addSeconds } from '../time/mjd.ts';
import {
  directionAt,
  dispersionMeasureAt,
  dispersionS,
  type PulsarDirection,
  pulsarDirection,
  roemerS,
  solarWindMeasure,
  sunShapiroS,
} from './delays.ts';
import { observerAt, type SiteOnEarth, type SkyTables } from './observer.ts';
import { orbitDelayOfArrivalS } from './orbit.ts';
import { dot } from './vector.ts';

export type { SiteOnEarth, SkyTables } from './observer.ts';

const NO_DELAYS: Delays = { clockS: 0, tdbMinusTtS: 0, roemerS: 0, shapiroS: 0, dispersionS: 0, orbitS: 0 };

/**
 * Brings an arrival from the site clock to TDB at the solar-system barycentre at infinite frequency:
 *
 *     barycentre = reading + clock (→ UTC → TAI → TT, or TT(BIPM)) + (TDB − TT) + Roemer − Shapiro − dispersion
 *
 * A `TDB` arrival is there already: only dispersion is taken off, at the frequency as it stands (no Doppler shift is known), and nothing
 * when the frequency is infinite. The dispersion is the interstellar medium's and, where the Sun's place is known, the solar wind's. A binary's orbit is worked out but left in the
 * time: `emissionTdb` takes it off. Nothing is thrown: a date that no table covers comes back `unusable`, with the time as received.
 * Neglected: troposphere (≤ 8 ns at the zenith, more at low elevation), the planets' Shapiro delay (≤ 0.2 µs).
 */
export function barycentre(
  arrival: ReceivedArrival,
  model: PulsarModel,
  site: SiteOnEarth | null,
  tables: SkyTables,
): BarycentredArrival {
  return withOrbit(barycentreTowards(arrival, pulsarDirection(model), site, tables), model.orbit);
}

/** As `barycentre`, blind to a binary's orbit; for many arrivals of one pulsar: the direction is prepared once by `pulsarDirection`. */
export function barycentreTowards(
  arrival: ReceivedArrival,
  pulsar: PulsarDirection,
  site: SiteOnEarth | null,
  tables: SkyTables,
): BarycentredArrival {
  if (arrival.timeScale === 'TDB') return withoutDispersion(arrival, pulsar);
  if (site === null) return unusable(arrival, [`site ${arrival.site} has no position`]);
  const observer = observerAt(arrival.time, site, tables);
  if (observer.quality === 'unusable') return unusable(arrival, observer.reasons);
  const direction = directionAt(pulsar, observer.tdb);
  const measure =
    dispersionMeasureAt(pulsar, observer.tdb) + solarWindMeasure(pulsar.solarWindPerCm3, direction, observer.fromSunKm);
  const delays: Delays = {
    clockS: observer.clockS,
    tdbMinusTtS: observer.tdbMinusTtS,
    roemerS: roemerS(pulsar, direction, observer.positionKm),
    shapiroS: sunShapiroS(direction, observer.fromSunKm),
    dispersionS: dispersionS(measure, arrival.frequencyMhz, dot(direction, observer.velocityKmPerS)),
    orbitS: 0,
  };
  const tdb = addSeconds(observer.tdb, delays.roemerS - delays.shapiroS - delays.dispersionS);
  return { tdb, delays, quality: observer.quality, qualityReasons: observer.reasons };
}

function withoutDispersion(arrival: ReceivedArrival, pulsar: PulsarDirection): BarycentredArrival {
  const measure = dispersionMeasureAt(pulsar, arrival.time);
  const delays = { ...NO_DELAYS, dispersionS: dispersionS(measure, arrival.frequencyMhz, 0) };
  return { tdb: addSeconds(arrival.time, -delays.dispersionS), delays, quality: 'ok', qualityReasons: [] };
}

function withOrbit(arrival: BarycentredArrival, orbit: Orbit | undefined): BarycentredArrival {
  if (orbit === undefined || arrival.quality === 'unusable') return arrival;
  return { ...arrival, delays: { ...arrival.delays, orbitS: orbitDelayOfArrivalS(orbit, arrival.tdb) } };
}

function unusable(arrival: ReceivedArrival, qualityReasons: readonly string[]): BarycentredArrival {
  return { tdb: arrival.time, delays: NO_DELAYS, quality: 'unusable', qualityReasons };
}
