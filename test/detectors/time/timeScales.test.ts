import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { utcDayLengthS } from '../../../detectors/time/leapSeconds.ts';
import { compareMjd, daysBetween, type Mjd } from '../../../detectors/time/mjd.ts';
import { ttToUtc, utcToTt } from '../../../detectors/time/timeScales.ts';
import { leapSecondTable } from '../../support/sky.ts';

const table = leapSecondTable();
const NS_DAYS = 1e-9 / 86_400;

const leapDays = table.entries.slice(1).map((entry) => entry.mjd - 1);
const day = fc.oneof(
  fc.integer({ min: 41_317, max: 61_500 }),
  fc.constantFrom(...leapDays, ...leapDays.map((d) => d + 1)),
);
const fraction = fc.oneof(
  fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
  fc.double({ min: 0, max: 1.5e-5, noNaN: true }),
  fc.double({ min: 1 - 1.5e-5, max: 1, maxExcluded: true, noNaN: true }),
);
const utc: fc.Arbitrary<Mjd> = fc.record({ day, fraction });

describe('UTC → TT', () => {
  it('gives the SOFA values', () => {
    // SOFA test program (t_sofa_c.c): iauUtctai, JD 2453750.5 + 0.892100694; TAI + 32.184 s by hand.
    const { tt } = utcToTt({ day: 53_750, fraction: 0.892100694 }, table);
    expect(Math.abs(daysBetween(tt, { day: 53_750, fraction: 0.8924826384444444 + 32.184 / 86_400 }))).toBeLessThan(
      1e-15,
    );
    // SOFA time-scale cookbook: UTC 2006 January 15, 21:24:37.5 is TT 21:25:42.684.
    const cookbook = utcToTt({ day: 53_750, fraction: 77_077.5 / 86_400 }, table).tt;
    expect(Math.abs(daysBetween(cookbook, { day: 53_750, fraction: 77_142.684 / 86_400 }))).toBeLessThan(
      0.02 * NS_DAYS,
    );
  });

  it('gives the leap second itself a date', () => {
    // SOFA (iauD2dtf test): 1994 June 30, 23:59:60.13599 UTC is quasi-JD 2449533.5 + 0.99999 (of a day of 86 401 s).
    const { tt } = utcToTt({ day: 49_533, fraction: 0.99999 }, table);
    expect((tt.day - 49_534 + tt.fraction) * 86_400 - 28 - 32.184).toBeCloseTo(0.13599, 6);
  });

  it('is strictly monotonic, through leap seconds too', () => {
    fc.assert(
      fc.property(utc, utc, (a, b) => {
        fc.pre(Math.abs(daysBetween(a, b)) > 1e-13);
        expect(Math.sign(compareMjd(utcToTt(a, table).tt, utcToTt(b, table).tt))).toBe(Math.sign(compareMjd(a, b)));
      }),
      { numRuns: 1000 },
    );
  });

  it('there and back to 0.03 ns, in the same day', () => {
    fc.assert(
      fc.property(utc, (t) => {
        const back = ttToUtc(utcToTt(t, table).tt, table);
        const error = back.day - t.day + (back.fraction - t.fraction);
        expect(Math.abs(error) * utcDayLengthS(table, t.day)).toBeLessThan(3e-11);
      }),
      { numRuns: 1000 },
    );
  });
});
