import type { Quality } from '../arrival.ts';
import type { LeapSecondTable } from '../time/leapSeconds.ts';
import { addSeconds, type Mjd } from '../time/mjd.ts';
import { type ClockTable, clockCorrection } from '../time/siteClock.ts';
import { TT_MINUS_TAI_S, utcToTt } from '../time/timeScales.ts';
import { type TtBipmTable, ttBipmMinusTtTai } from '../time/ttBipm.ts';
import { LIGHT_KM_PER_S } from './constants.ts';
import { type EarthOrientationTable, earthOrientationAt, type SiteMotion, siteInGcrs } from './earthOrientation.ts';
import { type TdbMinusTtTable, tdbMinusTtAtGeocentre } from './earthSunTable.ts';
import { type Ephemeris, earthAndSun } from './ephemeris.ts';
import { difference, dot, sum, type Vector } from './vector.ts';

/** Everything the way to the barycentre is read from. */
export interface SkyTables {
  readonly earthSun: Ephemeris;
  /**
   * Goes with every ephemeris: TDB − TT of two of them differs by a few ns (Fairhead & Bretagnon's series, which rests on an older
   * ephemeris, is within 3 ns of DE405 from 1950 to 2050: SOFA, *dtdb*).
   */
  readonly tdbMinusTt: TdbMinusTtTable;
  readonly leapSeconds: LeapSecondTable;
  /** Null: TT = TAI + 32.184 s. */
  readonly ttBipm: TtBipmTable | null;
  /** Null: UT1 = UTC and no polar motion (≤ 1.4 µs). */
  readonly orientation: EarthOrientationTable | null;
}

/** A telescope, or the geocentre at [0, 0, 0]. */
export interface SiteOnEarth {
  readonly itrfM: readonly [number, number, number];
  /** Null: the clock keeps UTC. */
  readonly clock: ClockTable | null;
}

/** Where and when an arrival was received: all that does not depend on the pulsar. */
export interface Observer {
  readonly tdb: Mjd;
  /** Site clock to UTC, and TT(TAI) to TT(BIPM) where a table is given. */
  readonly clockS: number;
  readonly tdbMinusTtS: number;
  /** Against the solar-system barycentre. */
  readonly positionKm: Vector;
  readonly velocityKmPerS: Vector;
  readonly fromSunKm: Vector;
  readonly quality: Quality;
  readonly reasons: readonly string[];
}

export interface NoObserver {
  readonly quality: 'unusable';
  readonly reasons: readonly string[];
}

const GEOCENTRE: SiteMotion = { positionKm: [0, 0, 0], velocityKmPerS: [0, 0, 0] };

/**
 * The site clock's reading → TDB, place and velocity of the observer.
 *
 * TDB − TT is the geocentric series plus v⊕·r/c² (≤ 2.1 µs; Moyer 1981). The site's GCRS vector is added to the Earth's as it stands;
 * its relativistic change of scale is below 0.2 ns.
 */
export function observerAt(reading: Mjd, site: SiteOnEarth, tables: SkyTables): Observer | NoObserver {
  const clock = site.clock === null ? null : clockCorrection(site.clock, reading);
  const bipm = ttBipmMinusTtTai(tables.ttBipm, reading);
  const clockS = (clock === null ? 0 : clock.seconds) + bipm.seconds;
  const scale = utcToTt(reading, tables.leapSeconds);
  if (scale.quality === 'unusable') return { quality: 'unusable', reasons: [scale.reason] };
  const tt = clockS === 0 ? scale.tt : addSeconds(scale.tt, clockS);
  const geocentricS = tdbMinusTtAtGeocentre(tables.tdbMinusTt, tt);
  const nearTdb = geocentricS === null ? tt : addSeconds(tt, geocentricS);
  const sky = earthAndSun(tables.earthSun, nearTdb);
  if ('reason' in sky) return { quality: 'unusable', reasons: [sky.reason] };
  if (geocentricS === null) {
    return { quality: 'unusable', reasons: [`MJD ${reading.day} is outside the table of TDB − TT`] };
  }
  const orientation = earthOrientationAt(tables.orientation, reading);
  const ut1 = addSeconds(tt, orientation.ut1MinusUtcS - scale.taiMinusUtcS - TT_MINUS_TAI_S);
  const local = isGeocentre(site)
    ? GEOCENTRE
    : siteInGcrs(site.itrfM, tt, ut1, orientation.xArcsec, orientation.yArcsec);
  const topocentricS = dot(sky.earthKmPerS, local.positionKm) / (LIGHT_KM_PER_S * LIGHT_KM_PER_S);
  const positionKm = sum(sky.earthKm, local.positionKm);
  const doubts = [scale.reason, clock?.reason ?? '', bipm.reason, isGeocentre(site) ? '' : orientation.reason];
  const reasons = doubts.filter((reason) => reason !== '');
  return {
    tdb: addSeconds(nearTdb, topocentricS),
    clockS,
    tdbMinusTtS: geocentricS + topocentricS,
    positionKm,
    velocityKmPerS: sum(sky.earthKmPerS, local.velocityKmPerS),
    fromSunKm: difference(positionKm, sky.sunKm),
    quality: reasons.length === 0 ? 'ok' : 'extrapolated',
    reasons,
  };
}

function isGeocentre({ itrfM: [x, y, z] }: SiteOnEarth): boolean {
  return x === 0 && y === 0 && z === 0;
}
