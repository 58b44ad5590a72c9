import { expect, it } from 'vitest';
import { fnv1a, randomStream } from '../../../detectors/nulls/randomStream.ts';
import { drawn } from '../../../detectors/nulls/rehearsedPulsar.ts';

// Test vectors of the 32-bit FNV-1a hash: IETF draft-eastlake-fnv, appendix on test vectors (from memory).
it.each([
  ['', 0x811c9dc5],
  ['a', 0xe40c292c],
  ['foobar', 0xbf9cf968],
])('hashes “%s” as published', (text, hash) => {
  expect(fnv1a(text)).toBe(hash);
});

const DRAWS = 40_000;

it('gives the same numbers for the same text, and others for another', () => {
  const take = (text: string) => {
    const { uniform } = randomStream(text);
    return Array.from({ length: 5 }, uniform);
  };
  expect(take('KR 0417+31')).toEqual(take('KR 0417+31'));
  expect(take('KR 0417+31')).not.toEqual(take('KR 0417+32'));
});

it('is uniform and normal: moments within five standard errors of their closed forms', () => {
  const { uniform, normal } = randomStream('moments');
  const flat = Array.from({ length: DRAWS }, uniform);
  const normals = Array.from({ length: DRAWS }, normal);
  const mean = (values: readonly number[], power: number) =>
    values.reduce((sum, x) => sum + x ** power, 0) / values.length;
  const tolerance = (variance: number) => 5 * Math.sqrt(variance / DRAWS);
  expect(Math.abs(mean(flat, 1) - 1 / 2)).toBeLessThan(tolerance(1 / 12));
  expect(Math.abs(mean(flat, 2) - 1 / 3)).toBeLessThan(tolerance(4 / 45));
  expect(Math.abs(mean(normals, 1))).toBeLessThan(tolerance(1));
  expect(Math.abs(mean(normals, 2) - 1)).toBeLessThan(tolerance(2));
  expect(Math.abs(mean(normals, 4) - 3)).toBeLessThan(tolerance(96));
});

it('draws with the covariance asked for, also where a direction has none', () => {
  const covariance = [4, 3, 0, 3, 9, 0, 0, 0, 0];
  const random = randomStream('covariance');
  const draws = Array.from({ length: DRAWS }, () => drawn(covariance, random));
  const product = (i: number, j: number) => draws.reduce((sum, x) => sum + x[i]! * x[j]!, 0) / DRAWS;
  for (const [i, j] of [
    [0, 0],
    [0, 1],
    [1, 1],
  ] as const) {
    const expected = covariance[3 * i + j]!;
    const variance = covariance[4 * i]! * covariance[4 * j]! + expected ** 2;
    expect(Math.abs(product(i, j) - expected)).toBeLessThan(5 * Math.sqrt(variance / DRAWS));
  }
  expect(product(2, 2)).toBe(0);
});
