import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { emissionTdb } from '../../../detectors/arrival.ts';
import { barycentre } from '../../../detectors/sky/barycentre.ts';
import { barycentreOfEmission } from '../../../detectors/sky/orbit.ts';
import { siteArrival } from '../../../detectors/sky/siteArrival.ts';
import { addSeconds, compareMjd, daysBetween, formatMjd } from '../../../detectors/time/mjd.ts';
import { keplerianOrbit } from '../../support/orbits.ts';
import { arrivalAt, orientationOf, pulsarAt } from '../../support/sky.ts';

const loaded = loadTables({ hostLeapSecondFiles: [] }).tables;
const tables = { ...loaded, orientation: orientationOf(-0.2, 0.1, 0.3) };
const site = {
  itrfM: [-4_483_311.64, 2_648_815.92, -3_671_909.31],
  clock: {
    name: 'ridge',
    mjd: Float64Array.of(41_000, 55_000, 55_000, 74_000),
    addSeconds: Float64Array.of(-2e-6, 5e-6, -1e-3, 1e-3),
  },
} as const;

const leapDays = loaded.leapSeconds.entries.slice(1).map((entry) => entry.mjd);
const tdb = fc.oneof(
  fc.record({
    day: fc.integer({ min: 41_400, max: 61_000 }),
    fraction: fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
  }),
  // Within minutes of a leap second.
  fc
    .tuple(fc.constantFrom(...leapDays), fc.double({ min: -700, max: 700, noNaN: true }))
    .map(([day, seconds]) => addSeconds({ day, fraction: 0 }, seconds)),
);
const pulsar = fc
  .record({
    rightAscensionRad: fc.double({ min: 0, max: 6.28, noNaN: true }),
    declinationRad: fc.double({ min: -1.57, max: 1.57, noNaN: true }),
    dispersionMeasure: fc.double({ min: 0, max: 800, noNaN: true }),
  })
  .map(pulsarAt);
const frequencyMhz = fc.constantFrom(150, 1400, Number.POSITIVE_INFINITY);

describe('siteArrival', () => {
  it('there and back within 0.1 ns, near leap seconds too', () => {
    let worst = 0;
    fc.assert(
      fc.property(tdb, pulsar, frequencyMhz, (date, model, frequency) => {
        // A clock step of 1 ms backwards has two readings for one instant: left out.
        fc.pre(Math.abs(date.day - 55_000) > 1);
        const { reading, quality } = siteArrival(date, model, site, frequency, tables);
        const back = barycentre({ ...arrivalAt('0', frequency), time: reading }, model, site, tables);
        worst = Math.max(worst, Math.abs(daysBetween(back.tdb, date)) * 86_400);
        expect(quality).toBe('ok');
        expect(worst).toBeLessThan(1e-10);
      }),
      { numRuns: 400 },
    );
    console.info(`siteArrival there and back: largest difference ${(worst * 1e9).toFixed(4)} ns`);
  });

  it('there and back out of a binary, through a wind and a dispersion measure that change, within 0.1 ns', () => {
    const model = pulsarAt({
      orbit: keplerianOrbit({ periastronAdvanceRadPerS: 2e-9, einsteinDelayS: 0.004 }),
      dispersionMeasureSlope: { perYr: 0.01, epochMjd: 55_000 },
      solarWindPerCm3: 7.9,
    });
    for (let i = 0; i < 40; i++) {
      const emission = { day: 58_100 + 13 * i, fraction: (0.137 * i) % 1 };
      const passing = barycentreOfEmission(model.orbit, emission);
      const { reading } = siteArrival(passing, model, site, 150, tables);
      const back = barycentre({ ...arrivalAt('0', 150), time: reading }, model, site, tables);
      expect(Math.abs(daysBetween(back.tdb, passing)) * 86_400).toBeLessThan(1e-10);
      expect(Math.abs(daysBetween(emissionTdb(back), emission)) * 86_400).toBeLessThan(1e-10);
      expect(Math.abs(back.delays.orbitS)).toBeGreaterThan(1e-3);
    }
  });

  it('survives being written and read as text with 17 decimals', () => {
    const date = { day: 60_123, fraction: 0.123456789 };
    const { reading } = siteArrival(date, pulsarAt({}), site, 1400, tables);
    const back = barycentre(arrivalAt(formatMjd(reading), 1400), pulsarAt({}), site, tables);
    expect(Math.abs(daysBetween(back.tdb, date)) * 86_400).toBeLessThan(1e-10);
  });

  it('passes on that a date cannot be used', () => {
    const { quality, reasons } = siteArrival({ day: 80_000, fraction: 0 }, pulsarAt({}), site, 1400, tables);
    expect(quality).toBe('unusable');
    expect(reasons[0]).toMatch(/outside the DE405 table/);
  });
});

describe('barycentre', () => {
  it('keeps the order of arrivals of one frequency, through leap seconds', () => {
    const step = fc.double({ min: 1e-9, max: 1000, noNaN: true });
    const steady = { ...site, clock: null };
    fc.assert(
      fc.property(tdb, step, pulsar, (date, seconds, model) => {
        const at = (reading: typeof date) =>
          barycentre({ ...arrivalAt('0', 1400), time: reading }, model, steady, tables).tdb;
        const later = addSeconds(date, seconds);
        // With UT1 − UTC the same on both sides of a leap second the Earth turns by a second at once: up to 1.6 µs of light time.
        fc.pre(compareMjd(later, date) > 0 && (later.day === date.day || seconds > 2e-6));
        expect(compareMjd(at(later), at(date))).toBeGreaterThan(0);
      }),
      { numRuns: 400 },
    );
  });

  it('leaves a barycentric arrival where it is, but for the dispersion at its frequency as it stands', () => {
    const model = pulsarAt({ dispersionMeasure: 100 });
    const free = barycentre(arrivalAt('60000.25', Number.POSITIVE_INFINITY, 'TDB'), model, null, tables);
    expect(free).toMatchObject({ tdb: { day: 60_000, fraction: 0.25 }, quality: 'ok' });
    expect(Object.values(free.delays)).toEqual([0, 0, 0, 0, 0, 0]);
    const dispersed = barycentre(arrivalAt('60000.25', 1400, 'TDB'), model, null, tables);
    expect(daysBetween(free.tdb, dispersed.tdb) * 86_400).toBeCloseTo(0.2117, 4);
    expect(dispersed.delays.dispersionS).toBeCloseTo(0.2117, 4);
  });

  it('has no answer for a site without a position', () => {
    const answer = barycentre(arrivalAt('60000.25', 1400), pulsarAt({}), null, tables);
    expect(answer).toMatchObject({ quality: 'unusable', qualityReasons: ['site ridge has no position'] });
  });
});
