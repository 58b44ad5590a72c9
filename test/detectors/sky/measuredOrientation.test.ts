import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { earthOrientationAt, siteInGcrs } from '../../../detectors/sky/earthOrientation.ts';
import { parseEarthOrientation } from '../../../detectors/sky/earthOrientationFile.ts';
import { addSeconds } from '../../../detectors/time/mjd.ts';
import { TT_MINUS_TAI_S, utcToTt } from '../../../detectors/time/timeScales.ts';
import { leapSecondTable } from '../../support/sky.ts';

interface OrientationCase {
  readonly day: number;
  readonly fraction: number;
  readonly itrf_m: readonly [number, number, number];
  readonly ut1_minus_utc_s: number;
  readonly polar_motion_arcsec: readonly [number, number];
  readonly gcrs_km: readonly [number, number, number];
}

/** Origin, as its own note says: rows of the IERS's EOP 14 C04 around a leap second; cases by astropy 5.2.1 and ERFA. */
const { c04, cases }: { readonly c04: readonly string[]; readonly cases: readonly OrientationCase[] } = JSON.parse(
  readFileSync(new URL('./orientation-cases.json', import.meta.url), 'utf8'),
);
const parsed = parseEarthOrientation(c04.join('\n'), 'c04');
if ('problem' in parsed) throw new Error(parsed.problem);
const { table } = parsed;
const leapSeconds = leapSecondTable();
const LIGHT_KM_PER_NS = 299_792.458e-9;

describe('measured Earth orientation, against astropy and ERFA', () => {
  it('UT1 − UTC within 1 ns and the pole within 1 µas, through the leap second of 2016-12-31', () => {
    expect(cases.filter(({ day }) => day === 57_753).length).toBeGreaterThan(10);
    for (const { day, fraction, ut1_minus_utc_s, polar_motion_arcsec } of cases) {
      const found = earthOrientationAt(table, { day, fraction });
      expect(found.quality).toBe('ok');
      expect(Math.abs(found.ut1MinusUtcS - ut1_minus_utc_s)).toBeLessThan(1e-9);
      expect(Math.abs(found.xArcsec - polar_motion_arcsec[0])).toBeLessThan(1e-6);
      expect(Math.abs(found.yArcsec - polar_motion_arcsec[1])).toBeLessThan(1e-6);
    }
  });

  it('site vectors within 0.3 ns of light travel', () => {
    let worst = 0;
    for (const { day, fraction, itrf_m, gcrs_km } of cases) {
      const { ut1MinusUtcS, xArcsec, yArcsec } = earthOrientationAt(table, { day, fraction });
      const { tt, taiMinusUtcS } = utcToTt({ day, fraction }, leapSeconds);
      const ut1 = addSeconds(tt, ut1MinusUtcS - taiMinusUtcS - TT_MINUS_TAI_S);
      const { positionKm } = siteInGcrs(itrf_m, tt, ut1, xArcsec, yArcsec);
      worst = Math.max(worst, Math.hypot(...positionKm.map((v, k) => v - gcrs_km[k]!)) / LIGHT_KM_PER_NS);
    }
    console.info(`site vector, measured orientation: ${cases.length} cases, largest difference ${worst.toFixed(3)} ns`);
    expect(worst).toBeLessThan(0.3);
  });
});
