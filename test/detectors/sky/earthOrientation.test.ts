import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import {
  earthOrientationAt,
  earthRotationAngle,
  intermediatePole,
  siteInGcrs,
} from '../../../detectors/sky/earthOrientation.ts';
import { nutation } from '../../../detectors/sky/nutation.ts';
import type { Vector } from '../../../detectors/sky/vector.ts';
import { addSeconds, type Mjd } from '../../../detectors/time/mjd.ts';
import { utcToTt } from '../../../detectors/time/timeScales.ts';
import { leapSecondTable } from '../../support/sky.ts';

/** Computed with ERFA 2.0.0 (IAU 2006/2000A) by make-erfa-cases.py, which stands beside this file. */
interface ErfaCase {
  readonly day: number;
  readonly fraction: number;
  readonly itrf_m: readonly [number, number, number];
  readonly ut1_minus_utc_s: number;
  readonly polar_motion_arcsec: readonly [number, number];
  readonly tt_day: number;
  readonly tt_fraction: number;
  readonly era_rad: number;
  readonly pole: readonly [number, number, number];
  readonly nutation_rad: readonly [number, number];
  readonly gcrs_km: Vector;
}

const { cases }: { readonly cases: readonly ErfaCase[] } = JSON.parse(
  readFileSync(new URL('./erfa-cases.json', import.meta.url), 'utf8'),
);
const MAS = Math.PI / 648_000_000;
const LIGHT_KM_PER_NS = 299_792.458e-9;
const leapSeconds = leapSecondTable();

const centuries = (tt: Mjd) => (tt.day - 51_544.5 + tt.fraction) / 36_525;

function timesOf(c: ErfaCase): { readonly tt: Mjd; readonly ut1: Mjd } {
  const { tt, taiMinusUtcS } = utcToTt({ day: c.day, fraction: c.fraction }, leapSeconds);
  return { tt, ut1: addSeconds(tt, c.ut1_minus_utc_s - taiMinusUtcS - 32.184) };
}

describe('published check values', () => {
  // SOFA test program (t_sofa_c.c): iauEra00, iauXys06a, iauNut00b, iauC2t06a.
  it('Earth rotation angle', () => {
    expect(earthRotationAngle({ day: 54_388, fraction: 0 })).toBeCloseTo(0.4022837240028158, 11);
  });

  it('celestial pole and origin, to the 1 mas of the shorter series', () => {
    const pole = intermediatePole(centuries({ day: 53_736, fraction: 0 }));
    expect(Math.abs(pole.x - 0.0005791308482835292)).toBeLessThan(1 * MAS);
    expect(Math.abs(pole.y - 4.0205800994540205e-5)).toBeLessThan(1 * MAS);
    expect(Math.abs(pole.s - -1.22003229416458e-8)).toBeLessThan(0.1 * MAS);
  });

  it('nutation IAU 2000B', () => {
    const { longitudeRad, obliquityRad } = nutation(centuries({ day: 53_736, fraction: 0 }));
    expect(Math.abs(longitudeRad - -9.632552291148363e-6)).toBeLessThan(1e-13);
    expect(Math.abs(obliquityRad - 4.063197106621159e-5)).toBeLessThan(1e-13);
  });

  it('celestial to terrestrial, with polar motion: where the first axis of the Earth points', () => {
    const arcsecond = 1000 * MAS;
    const date = { day: 53_736, fraction: 0 };
    const { positionKm } = siteInGcrs([1000, 0, 0], date, date, 2.55060238e-7 / arcsecond, 1.860359247e-6 / arcsecond);
    expect(Math.abs(positionKm[0] - -0.18103321283059)).toBeLessThan(2 * MAS);
    expect(Math.abs(positionKm[1] - 0.98347698069386)).toBeLessThan(2 * MAS);
  });
});

describe('against ERFA, IAU 2006/2000A', () => {
  it('TT and Earth rotation angle', () => {
    for (const c of cases) {
      const { tt, ut1 } = timesOf(c);
      expect(Math.abs(tt.day - c.tt_day + (tt.fraction - c.tt_fraction))).toBeLessThan(5e-16);
      expect(Math.abs(earthRotationAngle(ut1) - c.era_rad)).toBeLessThan(1e-11);
    }
  });

  it('celestial pole within 2 mas, origin within 0.3 mas', () => {
    for (const c of cases) {
      const pole = intermediatePole(centuries(timesOf(c).tt));
      expect(Math.abs(pole.x - c.pole[0])).toBeLessThan(2 * MAS);
      expect(Math.abs(pole.y - c.pole[1])).toBeLessThan(2 * MAS);
      expect(Math.abs(pole.s - c.pole[2])).toBeLessThan(0.3 * MAS);
    }
  });

  it('site vectors within 0.3 ns of light travel', () => {
    let worst = 0;
    for (const c of cases) {
      const { tt, ut1 } = timesOf(c);
      const { positionKm } = siteInGcrs(c.itrf_m, tt, ut1, c.polar_motion_arcsec[0], c.polar_motion_arcsec[1]);
      worst = Math.max(worst, Math.hypot(...positionKm.map((v, k) => v - c.gcrs_km[k]!)) / LIGHT_KM_PER_NS);
    }
    console.info(`site vector: ${cases.length} cases, largest difference ${worst.toFixed(3)} ns`);
    expect(cases.length).toBeGreaterThanOrEqual(100);
    expect(worst).toBeLessThan(0.3);
  });
});

describe('site velocity', () => {
  it('is the derivative of the position', () => {
    const site = [3_822_626.04, -154_105.65, 5_086_486.04] as const;
    const at = (seconds: number) => {
      const t = addSeconds({ day: 58_000, fraction: 0.3 }, seconds);
      return siteInGcrs(site, t, t, 0.1, 0.3);
    };
    const before = at(-10).positionKm;
    const after = at(10).positionKm;
    for (const [k, speed] of at(0).velocityKmPerS.entries()) {
      expect(speed).toBeCloseTo((after[k]! - before[k]!) / 20, 7);
    }
  });
});

describe('earthOrientationAt', () => {
  const table = {
    name: 'bulletin',
    mjdUtc: Float64Array.of(57_752, 57_753, 57_754, 57_755),
    // A leap second at the end of MJD 57753: UT1 − UTC jumps, UT1 does not.
    ut1MinusUtcS: Float64Array.of(-0.4065, -0.4078, 0.5909, 0.5894),
    xArcsec: Float64Array.of(0.08, 0.081, 0.082, 0.083),
    yArcsec: Float64Array.of(0.28, 0.281, 0.282, 0.283),
  };

  it('goes straight between days and through a leap second', () => {
    expect(earthOrientationAt(table, { day: 57_752, fraction: 0.5 })).toMatchObject({ quality: 'ok', reason: '' });
    expect(earthOrientationAt(table, { day: 57_752, fraction: 0.5 }).ut1MinusUtcS).toBeCloseTo(-0.40715, 12);
    expect(earthOrientationAt(table, { day: 57_753, fraction: 0.9 }).ut1MinusUtcS).toBeCloseTo(
      -0.4078 - 0.9 * 0.0013,
      12,
    );
    expect(earthOrientationAt(table, { day: 57_754, fraction: 0 }).ut1MinusUtcS).toBe(0.5909);
    expect(earthOrientationAt(table, { day: 57_755, fraction: 0 }).xArcsec).toBe(0.083);
  });

  it('holds and marks the ends; no table is not an error', () => {
    expect(earthOrientationAt(table, { day: 57_760, fraction: 0 })).toMatchObject({
      ut1MinusUtcS: 0.5894,
      quality: 'extrapolated',
    });
    expect(earthOrientationAt(table, { day: 57_700, fraction: 0 })).toMatchObject({
      ut1MinusUtcS: -0.4065,
      quality: 'extrapolated',
    });
    expect(earthOrientationAt(null, { day: 57_760, fraction: 0 })).toMatchObject({ ut1MinusUtcS: 0, quality: 'ok' });
  });
});
