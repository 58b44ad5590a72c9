import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { arrivalVariance, writeProcessNoise, writeTransition } from '../../../detectors/filter/stateSpace.ts';

const walks = { phaseWalk: 0.3, frequencyWalk: 0.02, torqueWalk: 0.004 };

function transition(t: number): Float64Array {
  const f = new Float64Array(9);
  writeTransition(t, f);
  return f;
}

function noise(t: number): Float64Array {
  const q = new Float64Array(9);
  writeProcessNoise(t, walks, q);
  return q;
}

function times(a: Float64Array, b: Float64Array, transposeB = 0): Float64Array {
  const out = new Float64Array(9);
  for (let i = 0; i < 3; i++)
    for (let j = 0; j < 3; j++)
      for (let k = 0; k < 3; k++) out[3 * i + j]! += a[3 * i + k]! * (transposeB ? b[3 * j + k]! : b[3 * k + j]!);
  return out;
}

describe('state space of the rotation', () => {
  it('gives the discretisation of Van Loan 1978, by matrix exponential in scipy 1.17.1, at a gap of 7.3 days', () => {
    const expected = [
      8.929589852666663, 1.95281205, 0.25934466666666667, 1.95281205, 0.6646893333333332, 0.10658, 0.25934466666666667,
      0.10658, 0.0292,
    ];
    noise(7.3).forEach((entry, k) => {
      expect(entry).toBeCloseTo(expected[k]!, 13);
    });
  });

  it('composes: two gaps are one', () => {
    const gap = fc.double({ min: 0, max: 50, noNaN: true });
    fc.assert(
      fc.property(gap, gap, (a, b) => {
        const f = times(transition(b), transition(a));
        const whole = transition(a + b);
        const fqf = times(times(transition(b), noise(a)), transition(b), 1);
        const last = noise(b);
        const q = noise(a + b);
        for (let k = 0; k < 9; k++) {
          expect(Math.abs(f[k]! - whole[k]!)).toBeLessThanOrEqual(1e-13 * Math.abs(whole[k]!) + 1e-300);
          expect(Math.abs(fqf[k]! + last[k]! - q[k]!)).toBeLessThanOrEqual(1e-12 * Math.abs(q[k]!) + 1e-300);
        }
      }),
      { seed: 8 },
    );
  });

  it('adds scale and floor in quadrature', () => {
    const variance = arrivalVariance(0.003, { ...walks, uncertaintyScale: 1.5, floorTurns: 0.002 });
    expect(variance).toBeCloseTo(0.0045 ** 2 + 0.002 ** 2, 15);
  });
});
