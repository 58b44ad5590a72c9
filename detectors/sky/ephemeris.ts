import type { Mjd } from '../time/mjd.ts';
import { type EarthAndSun, type EarthSunTable, earthAndSunAt } from './earthSunTable.ts';
import { earthAndSunFromKernel, type SpkKernel } from './spkKernel.ts';

/** Where Earth and Sun are read from: the table that ships with the program, or an SPK kernel of the operator's. */
export type Ephemeris = EarthSunTable | SpkKernel;

/** Earth and Sun at a date (TDB), or in words why there is no answer. */
export function earthAndSun(ephemeris: Ephemeris, tdb: Mjd): EarthAndSun | { readonly reason: string } {
  if ('segments' in ephemeris) return earthAndSunFromKernel(ephemeris, tdb);
  const { ephemeris: name, startMjd, endMjd } = ephemeris;
  const found = earthAndSunAt(ephemeris, tdb);
  return found ?? { reason: `MJD ${tdb.day} is outside the ${name} table (MJD ${startMjd} to ${endMjd})` };
}
