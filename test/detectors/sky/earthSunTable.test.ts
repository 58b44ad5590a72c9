import { describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { endMjd } from '../../../detectors/sky/chebyshevTable.ts';
import { earthAndSunAt, readEarthSunTable, tdbMinusTtAtGeocentre } from '../../../detectors/sky/earthSunTable.ts';
import { difference, type Vector } from '../../../detectors/sky/vector.ts';
import { addSeconds, type Mjd, SECONDS_PER_DAY } from '../../../detectors/time/mjd.ts';

const { earthSun, tdbMinusTt } = loadTables({ hostLeapSecondFiles: [] }).tables;
const AU_KM = 149_597_870.7;
const LIGHT_KM_PER_NS = 299_792.458e-9;

const distance = (a: Vector, b: Vector) => Math.hypot(...difference(a, b));
const inKm = (au: Vector): Vector => [au[0] * AU_KM, au[1] * AU_KM, au[2] * AU_KM];

describe('Earth and Sun', () => {
  it('fit the published value of an independent theory within its error', () => {
    // SOFA test program (iauEpv00), a shortened VSOP2000: within 13.4 km and 5 mm/s (heliocentric 11.2 km) of DE405, 1900–2100.
    const sky = earthAndSunAt(earthSun, { day: 53_411, fraction: 0.52501161 })!;
    const earth = inKm([-0.771410444049111, 0.5598412061824171, 0.2425996277722452]);
    const fromSun = inKm([-0.7757238809297707, 0.559805224136334, 0.2426998466481687]);
    const velocity = inKm([-0.01091874268116823, -0.01246525461732862, -0.005404773180966231]);
    expect(distance(sky.earthKm, earth)).toBeLessThan(13.4);
    expect(distance(difference(sky.earthKm, sky.sunKm), fromSun)).toBeLessThan(11.2);
    const kmPerS: Vector = [
      velocity[0] / SECONDS_PER_DAY,
      velocity[1] / SECONDS_PER_DAY,
      velocity[2] / SECONDS_PER_DAY,
    ];
    expect(distance(sky.earthKmPerS, kmPerS)).toBeLessThan(5e-6);
  });

  it('the velocity is the derivative of the position', () => {
    for (let i = 0; i < 200; i++) {
      const at: Mjd = { day: 50_000 + 8 * i, fraction: 0.37 };
      const after = earthAndSunAt(earthSun, addSeconds(at, 60))!.earthKm;
      const before = earthAndSunAt(earthSun, addSeconds(at, -60))!.earthKm;
      for (const [k, speed] of earthAndSunAt(earthSun, at)!.earthKmPerS.entries()) {
        expect(Math.abs((after[k]! - before[k]!) / 120 - speed)).toBeLessThan(2e-9);
      }
    }
  });

  it('is smooth where two series meet: 0.3 ns of light time in place, 1 mm/s in velocity', () => {
    const { startMjd, stepDays, steps } = earthSun.earth;
    for (let step = 1; step < steps; step++) {
      const day = startMjd + step * stepDays;
      const after = earthAndSunAt(earthSun, { day, fraction: 0 })!;
      const before = earthAndSunAt(earthSun, { day: day - 1, fraction: 1 - 2 ** -53 })!;
      expect(distance(after.earthKm, before.earthKm)).toBeLessThan(0.3 * LIGHT_KM_PER_NS);
      expect(distance(after.earthKmPerS, before.earthKmPerS)).toBeLessThan(1e-6);
    }
  });

  it('covers 1970 to 2060 and says null outside', () => {
    expect(earthSun.ephemeris).toBe('DE405');
    expect(earthSun.startMjd).toBeLessThanOrEqual(40_587);
    expect(earthSun.endMjd).toBeGreaterThanOrEqual(73_459);
    expect(endMjd(tdbMinusTt.geocentre)).toBe(earthSun.endMjd);
    for (const day of [0, earthSun.startMjd - 1, earthSun.endMjd, 1e6, -5, Number.NaN, Number.POSITIVE_INFINITY]) {
      expect(earthAndSunAt(earthSun, { day, fraction: 0 })).toBeNull();
      expect(tdbMinusTtAtGeocentre(tdbMinusTt, { day, fraction: 0 })).toBeNull();
    }
    const lastInstant = { day: earthSun.endMjd - 1, fraction: 1 - 2 ** -53 };
    expect(Number.isFinite(earthAndSunAt(earthSun, lastInstant)!.earthKm[0])).toBe(true);
  });
});

describe('TDB − TT at the geocentre', () => {
  it('is within 10 µs of the seven-term formula (USNO Circular 179, eq. 2.6), 2000–2050', () => {
    for (let day = 51_545; day < 69_800; day += 13) {
      const T = (day - 51_544.5) / 36_525;
      const formula =
        0.001657 * Math.sin(628.3076 * T + 6.2401) +
        0.000022 * Math.sin(575.3385 * T + 4.297) +
        0.000014 * Math.sin(1256.6152 * T + 6.1969) +
        0.000005 * Math.sin(606.9777 * T + 4.0212) +
        0.000005 * Math.sin(52.9691 * T + 0.4444) +
        0.000002 * Math.sin(21.3299 * T + 5.5431) +
        0.00001 * T * Math.sin(628.3076 * T + 4.249);
      expect(Math.abs(tdbMinusTtAtGeocentre(tdbMinusTt, { day, fraction: 0 })! - formula)).toBeLessThan(10e-6);
    }
  });

  it('gives the value of the SOFA time-scale cookbook example', () => {
    // UTC 2006 January 15, 21:24:37.5; geocentric part recomputed with ERFA: 3.724635541865e-4 s.
    const tt = { day: 53_750, fraction: 77_142.684 / SECONDS_PER_DAY };
    expect(Math.abs(tdbMinusTtAtGeocentre(tdbMinusTt, tt)! - 3.724635541865e-4)).toBeLessThan(1e-9);
  });
});

describe('readEarthSunTable', () => {
  it('takes no damaged bytes for tables', () => {
    expect(readEarthSunTable(new Uint8Array(0))).toHaveProperty('problem');
    expect(readEarthSunTable(new TextEncoder().encode('x'.repeat(500)))).toEqual({ problem: 'not a sky table file' });
    const short = new Uint8Array(200);
    short.set(new TextEncoder().encode('SKYTABLE'));
    expect(readEarthSunTable(short)).toEqual({ problem: 'expected 3 tables, found 0' });
    short[16] = 3;
    expect(readEarthSunTable(short)).toEqual({ problem: expect.stringMatching(/cut short/) });
  });
});
