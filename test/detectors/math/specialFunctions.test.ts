import fc from 'fast-check';
import { errorFunction } from 'simple-statistics';
import { describe, expect, it } from 'vitest';
import { chiSquareTail, logGamma, regularisedGammaP, regularisedGammaQ } from '../../../detectors/math/gamma.ts';
import { logAddExp, logSumExp } from '../../../detectors/math/logSumExp.ts';
import {
  erfc,
  logNormalDensity,
  logNormalTail,
  normalQuantile,
  normalTail,
  normalTailQuantile,
} from '../../../detectors/math/normal.ts';

/** Expected values: mpmath 1.3.0 at 40 digits, rounded to double; scipy 1.17.1 agrees to its own last digits. */
function expectClose(value: number, expected: number, relative: number, absolute = 0): void {
  expect(Math.abs(value - expected), `${value} against ${expected}`).toBeLessThanOrEqual(
    relative * Math.abs(expected) + absolute,
  );
}

describe('normal distribution', () => {
  it.each([
    [-1.5, 1.9661051464753108],
    [-0.3, 1.3286267594591274],
    [0, 1],
    [0.1, 0.887537083981715],
    [0.5, 0.4795001221869535],
    [1, 0.15729920705028513],
    [1.9, 0.0072095707647425325],
    [2, 0.004677734981047266],
    [2.1, 0.002979466656332984],
    [3, 2.209049699858544e-5],
    [5, 1.537459794428035e-12],
    [10, 2.088487583762545e-45],
    [20, 5.395865611607901e-176],
    [26, 5.663192408856143e-296],
  ])('erfc(%d)', (x, expected) => expectClose(erfc(x), expected, 2e-13));

  it.each([
    [-8, -6.220960574271786e-16],
    [-3, -0.0013508099647481938],
    [-1, -0.17275377902344988],
    [0, -Math.LN2],
    [1, -1.8410216450092636],
    [2.9, -6.284058234947419],
    [5, -15.064998393988725],
    [38, -726.5572160188201],
    [1000, -500007.82669481216],
  ])('ln of the tail beyond %d', (z, expected) => expectClose(logNormalTail(z), expected, 2e-13));

  it.each([
    [1e-300, -37.0470962993612],
    [1e-20, -9.262340089798407],
    [1e-10, -6.361340902404057],
    [4.57e-6, -4.436578531655976],
    [0.025, -1.9599639845400543],
    [0.3, -0.5244005127080408],
    [0.5, 0],
    [0.9, 1.2815515655446006],
    [0.999999, 4.753424308817087],
  ])('quantile at %d', (p, expected) => expectClose(normalQuantile(p), expected, 5e-12));

  it('agrees with the error function of simple-statistics to that approximation’s stated 1.2e-7', () => {
    for (let x = 0; x < 4; x += 0.05) expectClose(1 - erfc(x), errorFunction(x), 0, 1.3e-7);
  });

  it('inverts its own tail', () => {
    fc.assert(
      fc.property(fc.double({ min: -6, max: 35, noNaN: true }), (z) => {
        // Above 1 − 1e-9 a tail no longer says where it came from.
        expectClose(normalTailQuantile(normalTail(z)), z, 1e-9, 1e-6);
      }),
      { seed: 1 },
    );
  });

  it('refuses what is not a probability', () => {
    expect(normalQuantile(1.2)).toBeNaN();
    expect(normalTailQuantile(-0.1)).toBeNaN();
    expect(normalQuantile(0)).toBe(Number.NEGATIVE_INFINITY);
  });

  it('density integrates to the tail', () => {
    let sum = 0;
    for (let x = 1; x < 12; x += 0.001) sum += 0.001 * Math.exp(logNormalDensity(x + 0.0005, 4));
    expectClose(sum, normalTail(0.5) - normalTail(6), 1e-6);
  });
});

describe('gamma functions', () => {
  it.each([
    [1e-5, 11.512919692895826],
    [0.1, 2.252712651734206],
    [0.5, 0.5723649429247001],
    [1, 0],
    [1.5, -0.12078223763524522],
    [2, 0],
    [3.3, 0.9870985778947344],
    [10, 12.801827480081469],
    [15.5, 26.536914491115613],
    [100, 359.1342053695754],
    [1e6, 12815504.569147611],
  ])('ln Γ(%d)', (x, expected) => expectClose(logGamma(x), expected, 2e-15, 2e-14));

  it('is undefined below zero', () => {
    expect(logGamma(-1)).toBeNaN();
    expect(regularisedGammaP(-1, 1)).toBeNaN();
    expect(regularisedGammaQ(1, -1)).toBeNaN();
  });

  it.each([
    [0.5, 0.1, 0.345279153981423, 0.654720846018577],
    [0.5, 3, 0.9856941215645704, 0.01430587843542964],
    [1, 1, 0.6321205588285577, 0.36787944117144233],
    [2.5, 1, 0.15085496391539036, 0.8491450360846097],
    [2.5, 10, 0.9987502694369687, 0.0012497305630313753],
    [10, 5, 0.03182805730620481, 0.9681719426937951],
    [10, 12, 0.7576078383294876, 0.24239216167051233],
    [50, 30, 0.0005188914625480343, 0.999481108537452],
    [50, 90, 0.9999983505014983, 1.6494985017178249e-6],
    [200, 180, 0.07485803498415958, 0.9251419650158405],
    [200, 320, 0.9999999999997647, 2.3522748472230576e-13],
    [1000, 1000, 0.5042052441802155, 0.4957947558197845],
    [1000, 1200, 0.9999999987118394, 1.2881606086281433e-9],
    [0.5, 300, 1, 1.674167984691788e-132],
  ])('P and Q(%d, %d)', (a, x, p, q) => {
    expectClose(regularisedGammaP(a, x), p, 2e-13);
    expectClose(regularisedGammaQ(a, x), q, 2e-13);
  });

  it('gives the critical values of χ² tables (Abramowitz & Stegun, table 26.8, 5 digits)', () => {
    for (const [degrees, tail, value] of [
      [1, 0.05, 3.84146],
      [2, 0.01, 9.21034],
      [5, 0.001, 20.515],
      [10, 0.05, 18.307],
      [30, 0.01, 50.8922],
    ] as const) {
      expectClose(chiSquareTail(value, degrees), tail, 1e-4);
    }
    // One and two degrees of freedom in closed form.
    expectClose(chiSquareTail(7.3 ** 2, 1), 2 * normalTail(7.3), 1e-12);
    expectClose(chiSquareTail(30, 2), Math.exp(-15), 1e-13);
    expect(chiSquareTail(0, 3)).toBe(1);
  });
});

describe('sums of exponentials', () => {
  it('does not overflow', () => {
    expectClose(logSumExp([1000, 1000]), 1000 + Math.LN2, 1e-15);
    expectClose(logAddExp(-1e4, -1e4), -1e4 + Math.LN2, 1e-15);
    expect(logSumExp([])).toBe(Number.NEGATIVE_INFINITY);
    expect(logAddExp(Number.NEGATIVE_INFINITY, 3)).toBe(3);
    expect(logSumExp([1, 2, 900], 2)).toBeCloseTo(Math.log(Math.exp(1) + Math.exp(2)), 14);
  });
});
