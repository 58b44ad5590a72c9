import { describe, expect, it } from 'vitest';
import { loadTables } from '../../../daemon/tables/loadTables.ts';
import { barycentre } from '../../../detectors/sky/barycentre.ts';
import { daysBetween } from '../../../detectors/time/mjd.ts';
import { parseTtBipmTable, ttBipmMinusTtTai } from '../../../detectors/time/ttBipm.ts';
import { arrivalAt, pulsarAt } from '../../support/sky.ts';

/** Made-up values of the right size. */
const parsed = parseTtBipmTable('# by hand\nmjd,tt_bipm_minus_tt_tai_us\n58000,27.66\n58100,27.68\n', 'bipm');
if ('problems' in parsed) throw new Error(parsed.problems[0]?.message);
const { table } = parsed;

describe('TT(BIPM)', () => {
  it('is read in microseconds and drawn straight', () => {
    expect(ttBipmMinusTtTai(table, { day: 58_050, fraction: 0 }).seconds).toBeCloseTo(27.67e-6, 15);
    expect(ttBipmMinusTtTai(null, { day: 58_050, fraction: 0 })).toEqual({ seconds: 0, quality: 'ok', reason: '' });
  });

  it('makes the arrival later by itself, and marks it outside the table', () => {
    const { tables } = loadTables({ hostLeapSecondFiles: [] });
    const site = { itrfM: [3_822_626.04, -154_105.65, 5_086_486.04], clock: null } as const;
    const time = (text: string, ttBipm: typeof table | null) =>
      barycentre(arrivalAt(text, 1400), pulsarAt({}), site, { ...tables, ttBipm });
    const laterS = daysBetween(time('58050.0', table).tdb, time('58050.0', null).tdb) * 86_400;
    // The Earth moves on meanwhile: 27.67 µs × 1e-4.
    expect(Math.abs(laterS - 27.67e-6)).toBeLessThan(3e-9);
    expect(time('58050.0', table).delays.clockS).toBeCloseTo(27.67e-6, 15);
    expect(time('58200.0', table)).toMatchObject({
      quality: 'extrapolated',
      qualityReasons: ['TT(BIPM) table bipm ended at MJD 58100; its end value is held'],
    });
  });
});
