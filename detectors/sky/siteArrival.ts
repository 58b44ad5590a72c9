import type { Quality, ReceivedArrival } from '../arrival.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { addSeconds, daysBetween, type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';
import { ttToUtc } from '../time/timeScales.ts';
import { barycentreTowards } from './barycentre.ts';
import { pulsarDirection } from './delays.ts';
import type { SiteOnEarth, SkyTables } from './observer.ts';

export interface SiteArrival {
  /** What the site clock reads. */
  readonly reading: Mjd;
  readonly quality: Quality;
  readonly reasons: readonly string[];
}

/** Each round divides the error by about 10⁴ (the speed of the Earth over that of light); from 1000 s three would do. */
const MOST_ROUNDS = 8;
const CLOSE_ENOUGH_S = 2e-11;

/**
 * The inverse of `barycentre`: when a pulse that would pass the barycentre at `tdb` (infinite frequency) is received at a site, to < 0.1 ns.
 * By fixed-point iteration. For rehearsals and invented data; `barycentreOfEmission` (orbit.ts) brings a pulse out of a binary before.
 */
export function siteArrival(
  tdb: Mjd,
  model: PulsarModel,
  site: SiteOnEarth,
  frequencyMhz: number,
  tables: SkyTables,
): SiteArrival {
  const pulsar = pulsarDirection(model);
  let tt = tdb;
  let reading = ttToUtc(tt, tables.leapSeconds);
  for (let round = 0; ; round++) {
    const there = barycentreTowards(received(model.name, reading, frequencyMhz), pulsar, site, tables);
    const errorS = daysBetween(tdb, there.tdb) * SECONDS_PER_DAY;
    const done = Math.abs(errorS) <= CLOSE_ENOUGH_S || round === MOST_ROUNDS;
    if (done || there.quality === 'unusable') {
      return { reading, quality: there.quality, reasons: there.qualityReasons };
    }
    tt = addSeconds(tt, errorS);
    reading = ttToUtc(tt, tables.leapSeconds);
  }
}

function received(pulsar: string, time: Mjd, frequencyMhz: number): ReceivedArrival {
  return {
    pulsar,
    timeText: '',
    timeScale: 'UTC',
    time,
    uncertaintyUs: 0,
    frequencyMhz,
    site: '',
    receiver: '',
    pulseNumber: null,
    signalToNoise: null,
    note: null,
  };
}
