import { addSeconds, type Mjd } from './time/mjd.ts';

/** One pulse arrival as the intake accepted it: the recorder's own numbers, nothing applied yet. */
export interface ReceivedArrival {
  readonly pulsar: string;
  /** The digits as they stood in the file. */
  readonly timeText: string;
  /** `UTC`: the site clock's reading. `TDB`: already at the solar-system barycentre (site `barycentre`). */
  readonly timeScale: 'UTC' | 'TDB';
  readonly time: Mjd;
  readonly uncertaintyUs: number;
  /** Infinity: dispersion was removed before. */
  readonly frequencyMhz: number;
  readonly site: string;
  /** Empty when the file names none. */
  readonly receiver: string;
  readonly pulseNumber: number | null;
  readonly signalToNoise: number | null;
  readonly note: string | null;
}

/** The bill from the site clock to the barycentre, in seconds (signs as in the sum: see `barycentre`). */
export interface Delays {
  /** Added: site clock to UTC, and TT(TAI) to TT(BIPM) where a table is given. */
  readonly clockS: number;
  /** Added. */
  readonly tdbMinusTtS: number;
  /** Added: light path site → barycentre, with proper motion and parallax. */
  readonly roemerS: number;
  /** Subtracted: the Sun's gravitational delay. */
  readonly shapiroS: number;
  /** Subtracted: dispersion at the Doppler-shifted frequency. */
  readonly dispersionS: number;
  /** Subtracted: binary orbit; 0 for an isolated pulsar. */
  readonly orbitS: number;
}

/** `extrapolated`: an answer is given but a table did not cover the date; `unusable`: no answer. */
export type Quality = 'ok' | 'extrapolated' | 'unusable';

/** An arrival brought to the barycentre: TDB, infinite frequency, before any binary orbit is removed. */
export interface BarycentredArrival {
  readonly tdb: Mjd;
  readonly delays: Delays;
  readonly quality: Quality;
  /** In words, for each table that did not cover the date. */
  readonly qualityReasons: readonly string[];
}

/** The time at which the pulsar's phase is read: emission, as the centre of mass of a binary sees it; the same time for an isolated pulsar. */
export function emissionTdb({ tdb, delays }: Pick<BarycentredArrival, 'tdb' | 'delays'>): Mjd {
  return delays.orbitS === 0 ? tdb : addSeconds(tdb, -delays.orbitS);
}

/** What the detector takes in, in time order. */
export interface TimedArrival {
  /** Identity of the arrival in the log. */
  readonly key: string;
  /** After a binary's orbit is removed (`emissionTdb`). */
  readonly tdb: Mjd;
  /** MJD as the site's clock read; absent: the arrival came at the barycentre. */
  readonly siteMjd?: number;
  readonly uncertaintyUs: number;
  readonly frequencyMhz: number;
  readonly site: string;
  readonly receiver: string;
  readonly pulseNumber: number | null;
}
