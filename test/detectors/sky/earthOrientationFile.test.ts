import { describe, expect, it } from 'vitest';
import { parseEarthOrientation } from '../../../detectors/sky/earthOrientationFile.ts';

/** Rows as published by the IERS: Bulletin A (finals2000A, 2016) and 14 C04 (1962). */
const FINALS = [
  '16 2 1 57359.00 I -0.003225 0.000031  0.299494 0.000025  I 0.0262864 0.0000042  1.3154 0.0035  I    -0.094    0.119    -0.077    0.029',
  '16 2 2 57360.00 I -0.004706 0.000030  0.301252 0.000024  I 0.0249911 0.0000057  1.2412 0.0034  I    -0.108    0.119    -0.082    0.035',
  '15 326 57361.00 P  0.007984 0.002113  0.387309 0.001679  P-0.5660324 0.0007012                 P    -0.010    0.239     0.145    0.600',
  '16 2 4 57362.00                                                                                                                     ',
];
const C04 = `     (0h UTC)

1962   1   1  37665  -0.012700   0.213000   0.0326338   0.0017230   0.000000   0.000000
1962   1   2  37666  -0.015900   0.214100   0.0320547   0.0016690   0.000000   0.000000
`;
/** The layout of the 20 C04 series: an hour column before the date. */
const C04_WITH_HOUR = `# YR  MM  DD  HH       MJD        x(")        y(")  UT1-UTC(s)
1962   1   1   0  37665.00   -0.012700    0.213000   0.0326338
`;

describe('parseEarthOrientation', () => {
  it('reads finals2000A up to the first day without values', () => {
    const parsed = parseEarthOrientation(FINALS.join('\n'), 'finals');
    expect(parsed).toEqual({
      table: {
        name: 'finals',
        mjdUtc: Float64Array.of(57_359, 57_360, 57_361),
        xArcsec: Float64Array.of(-0.003225, -0.004706, 0.007984),
        yArcsec: Float64Array.of(0.299494, 0.301252, 0.387309),
        ut1MinusUtcS: Float64Array.of(0.0262864, 0.0249911, -0.5660324),
      },
    });
  });

  it('reads C04 with and without the hour', () => {
    expect(parseEarthOrientation(C04, 'c04')).toMatchObject({
      table: { mjdUtc: Float64Array.of(37_665, 37_666), ut1MinusUtcS: Float64Array.of(0.0326338, 0.0320547) },
    });
    expect(parseEarthOrientation(C04_WITH_HOUR, 'c04')).toMatchObject({
      table: { mjdUtc: Float64Array.of(37_665), xArcsec: Float64Array.of(-0.0127), yArcsec: Float64Array.of(0.213) },
    });
  });

  it.each([
    ['', /no row/, null],
    ['<html>not found</html>', /no row/, null],
    [[FINALS[1], FINALS[0]].join('\n'), /MJD 57359 does not rise/, 2],
    [FINALS[0]!.replace('0.0262864', '0.02x2864'), /not a row/, 1],
    ['1962   1   1  37665  -0.012700', /not a row/, 1],
  ])('says what is wrong', (text, problem, line) => {
    expect(parseEarthOrientation(text, 'x')).toEqual({ problem: expect.stringMatching(problem), line });
  });
});
