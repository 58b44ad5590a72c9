import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { barycentre } from '../../../detectors/sky/barycentre.ts';
import type { SiteOnEarth, SkyTables } from '../../../detectors/sky/observer.ts';
import { parseMjd } from '../../../detectors/time/mjd.ts';
import { arrivalAt, orientationOf, pulsarAt } from '../../support/sky.ts';

interface ReferenceCase {
  readonly mjd_utc: string;
  readonly itrf_m: readonly [number, number, number];
  readonly right_ascension_deg: number;
  readonly declination_deg: number;
  readonly proper_motion_mas_per_yr: readonly [number, number];
  readonly position_epoch_mjd: number;
  readonly parallax_mas: number;
  readonly dispersion_measure: number;
  readonly frequency_mhz: number;
  readonly ut1_minus_utc_s: number;
  readonly polar_motion_arcsec: readonly [number, number];
  readonly expected: {
    readonly tdb_minus_tt_s: number;
    readonly roemer_s: number;
    readonly shapiro_s: number;
    readonly dispersion_s: number;
    readonly barycentre_tdb_mjd: string;
  };
}

const NS = 1e-9;

/** Origin, as its own note says: computed with ERFA 2.0.0 (IAU 2006/2000A, full dtdb) and the JPL DE405 table that Debian packages. */
const reference: { readonly cases: readonly ReferenceCase[] } = JSON.parse(
  readFileSync(new URL('./barycentre.json', import.meta.url), 'utf8'),
);
const { tables } = loadTables();

function ourAnswer(c: ReferenceCase) {
  const site: SiteOnEarth = { itrfM: c.itrf_m, clock: null };
  const ofCase: SkyTables = {
    ...tables,
    orientation: orientationOf(c.ut1_minus_utc_s, c.polar_motion_arcsec[0], c.polar_motion_arcsec[1]),
  };
  const model = pulsarAt({
    rightAscensionRad: (c.right_ascension_deg * Math.PI) / 180,
    declinationRad: (c.declination_deg * Math.PI) / 180,
    positionEpochMjd: c.position_epoch_mjd,
    properMotionMasPerYr: c.proper_motion_mas_per_yr,
    parallaxMas: c.parallax_mas,
    dispersionMeasure: c.dispersion_measure,
  });
  return barycentre(arrivalAt(c.mjd_utc, c.frequency_mhz), model, site, ofCase);
}

function differenceS(c: ReferenceCase): number {
  const expected = parseMjd(c.expected.barycentre_tdb_mjd)!;
  const { tdb } = ourAnswer(c);
  return (tdb.day - expected.day + (tdb.fraction - expected.fraction)) * 86_400;
}

describe('barycentre against an independent computation with the same ephemeris', () => {
  const differences = reference.cases.map(differenceS);
  const rms = Math.sqrt(differences.reduce((total, d) => total + d * d, 0) / differences.length);
  const largest = Math.max(...differences.map(Math.abs));
  console.info(
    `barycentre: ${differences.length} cases, rms ${(rms / NS).toFixed(2)} ns, largest ${(largest / NS).toFixed(2)} ns`,
  );

  it('has all the cases', () => expect(reference.cases.length).toBe(200));

  it('agrees within 5 ns on every case and 2 ns rms', () => {
    expect(largest).toBeLessThan(5 * NS);
    expect(rms).toBeLessThan(2 * NS);
  });

  it.each([
    ['TDB − TT', 'tdbMinusTtS', 'tdb_minus_tt_s'],
    ['Roemer', 'roemerS', 'roemer_s'],
    ['Shapiro', 'shapiroS', 'shapiro_s'],
    ['dispersion', 'dispersionS', 'dispersion_s'],
  ] as const)('item by item: %s', (name, ours, theirs) => {
    const worst = Math.max(...reference.cases.map((c) => Math.abs(ourAnswer(c).delays[ours] - c.expected[theirs])));
    console.info(`barycentre: largest difference in ${name}: ${(worst / NS).toFixed(3)} ns`);
    expect(worst).toBeLessThan(5 * NS);
  });
});
