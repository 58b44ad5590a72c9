import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { observerAt } from '../../../detectors/sky/observer.ts';
import { daysBetween, type Mjd } from '../../../detectors/time/mjd.ts';
import { orientationOf } from '../../support/sky.ts';

const { tables } = loadTables({ hostLeapSecondFiles: [] });
const NS = 1e-9;

function usable(reading: Mjd, site: Parameters<typeof observerAt>[1], orientation = tables.orientation) {
  const observer = observerAt(reading, site, { ...tables, orientation });
  if (observer.quality === 'unusable') throw new Error(observer.reasons.join());
  return observer;
}

describe('TDB at a site', () => {
  it('SOFA time-scale cookbook: Hawaii, UTC 2006 January 15, 21:24:37.5 is TDB 21:25:42.684373', () => {
    // SOFA Time Scale and Calendar Tools, worked example; TDB − TT topocentric recomputed with ERFA: 3.727942135960e-4 s.
    const site = { itrfM: [-5_492_333.306499, -2_453_018.508912, 2_113_645.653406], clock: null } as const;
    const { tdb, tdbMinusTtS } = usable(
      { day: 53_750, fraction: 77_077.5 / 86_400 },
      site,
      orientationOf(0.3341, 0, 0),
    );
    expect(Math.abs(daysBetween(tdb, { day: 53_750, fraction: 77_142.684372794 / 86_400 })) * 86_400).toBeLessThan(
      2 * NS,
    );
    expect(Math.abs(tdbMinusTtS - 3.72794213596e-4)).toBeLessThan(2 * NS);
  });

  it('is within 3 ns of the full series with its own topocentric terms (ERFA dtdb)', () => {
    const { cases } = JSON.parse(readFileSync(new URL('./erfa-cases.json', import.meta.url), 'utf8'));
    let worst = 0;
    for (const c of cases) {
      const [x, y] = c.polar_motion_arcsec;
      const site = { itrfM: c.itrf_m, clock: null };
      const { tdbMinusTtS } = usable(
        { day: c.day, fraction: c.fraction },
        site,
        orientationOf(c.ut1_minus_utc_s, x, y),
      );
      worst = Math.max(worst, Math.abs(tdbMinusTtS - c.tdb_minus_tt_s));
    }
    console.info(`TDB − TT at a site: ${cases.length} cases, largest difference ${(worst / NS).toFixed(2)} ns`);
    expect(worst).toBeLessThan(3 * NS);
  });
});

describe('quality', () => {
  const itrfM = [3_822_626.04, -154_105.65, 5_086_486.04] as const;
  const clock = { name: 'ridge', mjd: Float64Array.of(59_000, 59_100), addSeconds: Float64Array.of(1e-6, 1e-6) };

  it('is ok inside all tables, and without an orientation table', () => {
    expect(usable({ day: 59_050, fraction: 0.5 }, { itrfM, clock })).toMatchObject({
      quality: 'ok',
      reasons: [],
      clockS: 1e-6,
    });
  });

  it('names each table that did not cover the date', () => {
    const short = { ...orientationOf(0.1, 0, 0), mjdUtc: Float64Array.of(58_000, 58_100) };
    const day = tables.leapSeconds.expiresMjd + 10;
    const { quality, reasons } = usable({ day, fraction: 0 }, { itrfM, clock }, short);
    expect(quality).toBe('extrapolated');
    expect(reasons).toEqual([
      expect.stringMatching(/leap-second table ended/),
      expect.stringMatching(/clock table ridge ended/),
      expect.stringMatching(/Earth orientation table constant ended/),
    ]);
  });

  it('does not ask the Earth orientation at the geocentre', () => {
    const short = { ...orientationOf(0.1, 0, 0), mjdUtc: Float64Array.of(58_000, 58_100) };
    expect(usable({ day: 59_050, fraction: 0 }, { itrfM: [0, 0, 0], clock: null }, short).quality).toBe('ok');
  });

  it.each([0, 41_000, 73_500, 1_000_000, Number.NaN])('has no answer at MJD %d', (day) => {
    const observer = observerAt({ day, fraction: 0 }, { itrfM, clock: null }, tables);
    expect(observer).toEqual({ quality: 'unusable', reasons: [expect.stringMatching(/^MJD /)] });
  });

  it('a clock correction moves the observer in time', () => {
    const late = usable({ day: 59_050, fraction: 0.5 }, { itrfM, clock });
    const plain = usable({ day: 59_050, fraction: 0.5 }, { itrfM, clock: null });
    expect(daysBetween(late.tdb, plain.tdb) * 86_400).toBeCloseTo(1e-6, 10);
  });
});
