import { describe, expect, it } from 'vitest';
import { parseLeapSeconds, taiMinusUtcS, utcDayLengthS } from '../../../detectors/time/leapSeconds.ts';
import { leapSecondTable } from '../../support/sky.ts';

const table = leapSecondTable();

describe('TAI − UTC', () => {
  // SOFA test program (t_sofa_c.c, iauDat): 2003 June 1, 2008 January 17, 2017 September 1.
  it.each([
    [52_791, 32],
    [54_482, 33],
    [57_997, 37],
  ])('on MJD %i is %i s', (mjd, seconds) => expect(taiMinusUtcS(table, mjd)).toMatchObject({ seconds, quality: 'ok' }));

  it('has 86 401 s in the day that ends with a leap second', () => {
    // IERS Bulletin C 52: a leap second at the end of 2016 December 31 (MJD 57753).
    expect(utcDayLengthS(table, 57_753)).toBe(86_401);
    expect(utcDayLengthS(table, 57_752)).toBe(86_400);
    expect(utcDayLengthS(table, 57_754)).toBe(86_400);
  });

  it('marks dates after the expiry and refuses dates before 1972', () => {
    expect(taiMinusUtcS(table, table.expiresMjd)).toMatchObject({ seconds: 37, quality: 'extrapolated' });
    expect(taiMinusUtcS(table, table.expiresMjd - 1)).toMatchObject({ seconds: 37, quality: 'ok', reason: '' });
    expect(taiMinusUtcS(table, 41_316).quality).toBe('unusable');
    expect(taiMinusUtcS(table, 41_317)).toMatchObject({ seconds: 10, quality: 'ok' });
    expect(taiMinusUtcS(table, Number.NaN).quality).toBe('unusable');
  });
});

describe('parseLeapSeconds', () => {
  const head = '#@\t4023129600\n2272060800\t10\t# 1 Jan 1972\n';

  it.each([
    [`${head}2287785600 twelve`, /^line 3:/],
    [`${head}2272060800 11`, /^line 3: must be later/],
    [`${head}2287785600 12`, /^line 3: .*one second apart/],
    [`${head}2287785601 11`, /^line 3: not the start of a day/],
    ['2272060800 10', /expiry/],
    ['#@ 4023129600', /no leap seconds/],
  ])('names what is wrong with %j', (text, problem) => {
    expect(parseLeapSeconds(text)).toEqual({ problem: expect.stringMatching(problem) });
  });
});
