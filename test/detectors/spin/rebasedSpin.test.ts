import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { formatDoubleDouble, parseDoubleDouble, twoSum } from '../../../detectors/spin/doubleDouble.ts';
import { rebasedSpin } from '../../../detectors/spin/rebasedSpin.ts';
import { phaseEvaluator } from '../../../detectors/spin/spinDownModel.ts';
import { addSeconds } from '../../../detectors/time/mjd.ts';
import { modelOf } from '../../support/simulatedWatch.ts';

describe('a spin-down about another epoch', () => {
  const start = modelOf({ frequencyHz: '641.928222127829', frequencyDerivativeHzPerS: -4.331e-14, epochMjd: 50_000 });
  const model = {
    ...start,
    spin: {
      ...start.spin,
      frequencySecondDerivativeHzPerS2: 3e-27,
      higherFrequencyDerivatives: [-2e-36],
      phaseAtEpochTurns: 0.123,
    },
  };

  test('is the same rotation to 1e-6 turn, over twenty years at 642 Hz', () => {
    const moved = { ...model, spin: rebasedSpin(model, { day: 57_301, fraction: 0.25 }) };
    const [asWas, asIs] = [phaseEvaluator(model), phaseEvaluator(moved)];
    for (let day = 50_000; day < 60_000; day += 371) {
      const at = addSeconds({ day, fraction: 0.7 }, day);
      const apart = asWas(at).deviationTurns - asIs(at).deviationTurns;
      expect(Math.abs(apart - Math.round(apart))).toBeLessThan(1e-6);
      expect(Math.abs(asWas(at).frequencyHz - asIs(at).frequencyHz)).toBeLessThan(1e-12);
    }
  });

  test('gives away what is taken off', () => {
    const at = { day: 52_000, fraction: 0 };
    const less = { ...model, spin: rebasedSpin(model, at, { turns: 0.2, hz: 1e-7, hzPerS: 1e-15 }) };
    const [asWas, asIs] = [phaseEvaluator(model), phaseEvaluator(less)];
    for (const days of [0, 1, 3]) {
      const seconds = days * 86_400;
      const date = addSeconds(at, seconds);
      const apart = asWas(date).deviationTurns - asIs(date).deviationTurns;
      const expected = 0.2 + 1e-7 * seconds + 0.5e-15 * seconds ** 2;
      expect(Math.abs(apart - expected - Math.round(apart - expected))).toBeLessThan(1e-7);
    }
  });
});

describe('a number of two doubles as text', () => {
  test.each([
    ['6.3417701123349', '6.3417701123349'],
    ['0.1', '0.1'],
    ['-0.00000041', '-0.00000041'],
    ['59000', '59000'],
    ['0', '0'],
  ])('%s is written as it was', (text, expected) => {
    expect(formatDoubleDouble(parseDoubleDouble(text))).toBe(expected);
  });

  test('reads back as the same number, to 31 digits', () => {
    const part = fc.double({ min: 1e-5, max: 2000, noNaN: true });
    const small = fc.double({ min: -1, max: 1, noNaN: true });
    fc.assert(
      fc.property(part, small, (hi, share) => {
        const value = twoSum(hi, share * hi * 2 ** -54);
        const back = parseDoubleDouble(formatDoubleDouble(value));
        expect(Math.abs(back.hi - value.hi + (back.lo - value.lo))).toBeLessThanOrEqual(hi * 1e-30);
      }),
    );
  });
});
