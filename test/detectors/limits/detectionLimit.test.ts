import { describe, expect, test } from 'vitest';
import { detectionLimit, limitAtCadence } from '../../../detectors/limits/detectionLimit.ts';
import { every, followed, type QuietPulsar } from '../../support/quietWatch.ts';

const limitOf = (pulsar: QuietPulsar) => detectionLimit(followed(pulsar)).deltaNuOverNu90!;

describe('the detection limit', () => {
  test('is null with a reason where nothing true can be said', () => {
    expect(detectionLimit(followed({ days: [] }))).toMatchObject({ deltaNuOverNu90: null, reason: 'no arrivals yet' });
    expect(detectionLimit(followed({ days: every(3, 8) }))).toMatchObject({
      deltaNuOverNu90: null,
      delayDays90: null,
      reason: expect.stringContaining('not settled'),
    });
  });

  test('is the same whenever it is asked for', () => {
    const watch = followed({ days: every(3, 40) });
    expect(detectionLimit(watch)).toEqual(detectionLimit(watch));
    expect(detectionLimit(followed({ days: every(3, 40) }))).toEqual(detectionLimit(watch));
  });

  test('falls with smaller errors', () => {
    const days = every(4, 60);
    const [fine, usual, coarse] = [20, 100, 500].map((uncertaintyUs) => limitOf({ days, uncertaintyUs }));
    expect(fine!).toBeLessThan(usual! / 2);
    expect(usual!).toBeLessThan(coarse! / 2);
  });

  test('rises with the noise that was learned', () => {
    const watch = followed({ days: every(4, 60) });
    const limits = [1e-15, 1e-13, 1e-11].map((torqueWalk) => {
      watch.likelyNoise = { ...watch.likelyNoise, torqueWalk };
      watch.noise = { ...watch.noise, torqueWalk: 1.5 * torqueWalk };
      return detectionLimit(watch).deltaNuOverNu90!;
    });
    expect(limits[0]!).toBeLessThan(limits[1]!);
    expect(limits[1]!).toBeLessThan(limits[2]!);
  });

  test('falls with a denser cadence, and what is seen sooner is larger', () => {
    const watch = followed({ days: every(4, 60), torqueWalk: 1e-12 });
    const limits = [2, 7, 30].map((days) => limitAtCadence(watch, days).deltaNuOverNu90!);
    expect(limits[0]!).toBeLessThan(limits[1]!);
    expect(limits[1]!).toBeLessThan(limits[2]!);
    const { curve, delayDays90, deltaNuOverNu90 } = detectionLimit(watch);
    const sizes = curve.map((l) => l.deltaNuOverNu90);
    expect(sizes).toEqual([...sizes].sort((a, b) => b - a));
    expect(curve).toContainEqual({ delayDays: delayDays90, deltaNuOverNu90 });
    expect(deltaNuOverNu90!).toBeLessThanOrEqual(1.1 * sizes.at(-1)!);
  });
});
