import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  add,
  multiply,
  parseDoubleDouble,
  splitWhole,
  twoProduct,
  twoSum,
} from '../../../detectors/spin/doubleDouble.ts';
import type { DoubleDouble, KnownGlitch, PulsarModel } from '../../../detectors/spin/pulsarModel.ts';
import { glitchFrequency, phaseEvaluator } from '../../../detectors/spin/spinDownModel.ts';
import type { Mjd } from '../../../detectors/time/mjd.ts';

/** Exact rational arithmetic, the outside authority of this file. */
class Rational {
  readonly n: bigint;
  readonly d: bigint;
  constructor(n: bigint, d: bigint) {
    this.n = n;
    this.d = d;
  }
  static of(value: number): Rational {
    let doubled = value;
    let d = 1n;
    while (!Number.isInteger(doubled)) {
      doubled *= 2;
      d *= 2n;
    }
    return new Rational(BigInt(doubled), d);
  }
  static decimal(text: string): Rational {
    const [whole = '', fraction = ''] = text.split('.');
    return new Rational(BigInt(whole + fraction), 10n ** BigInt(fraction.length));
  }
  static sum({ hi, lo }: DoubleDouble): Rational {
    return Rational.of(hi).plus(Rational.of(lo));
  }
  plus(b: Rational): Rational {
    return new Rational(this.n * b.d + b.n * this.d, this.d * b.d);
  }
  minus(b: Rational): Rational {
    return this.plus(new Rational(-b.n, b.d));
  }
  times(b: Rational): Rational {
    return new Rational(this.n * b.n, this.d * b.d);
  }
  /** Nearest whole number, halves upward, and the rest as a double. */
  split(): { whole: bigint; rest: number } {
    const doubled = 2n * this.n + this.d;
    let whole = doubled / (2n * this.d);
    if (doubled < 0n && doubled % (2n * this.d) !== 0n) whole -= 1n;
    return { whole, rest: new Rational(this.n - whole * this.d, this.d).number() };
  }
  number(): number {
    return Number((this.n * 10n ** 40n) / this.d) / 1e40;
  }
}

const finite = fc.double({ min: -1e12, max: 1e12, noNaN: true }).filter((x) => x === 0 || Math.abs(x) > 1e-12);

describe('double-double', () => {
  it('forms sums and products of doubles without error', () => {
    fc.assert(
      fc.property(finite, finite, (a, b) => {
        expect(Rational.sum(twoSum(a, b)).minus(Rational.of(a).plus(Rational.of(b))).n).toBe(0n);
        expect(Rational.sum(twoProduct(a, b)).minus(Rational.of(a).times(Rational.of(b))).n).toBe(0n);
      }),
      { seed: 5 },
    );
  });

  it('adds and multiplies to 2⁻¹⁰² of the result', () => {
    const pair = fc
      .tuple(finite, fc.double({ min: -1, max: 1, noNaN: true }))
      .map(([hi, part]) => twoSum(hi, hi * part * 2 ** -54));
    fc.assert(
      fc.property(pair, pair, (a, b) => {
        for (const [got, exact] of [
          [add(a, b), Rational.sum(a).plus(Rational.sum(b))],
          [multiply(a, b), Rational.sum(a).times(Rational.sum(b))],
        ] as const) {
          const error = Math.abs(Rational.sum(got).minus(exact).number());
          expect(error).toBeLessThanOrEqual(2 ** -102 * Math.abs(exact.number()) + 1e-40);
        }
      }),
      { seed: 6 },
    );
  });

  it('reads decimal text exactly rounded, beyond one double', () => {
    const text = '9.754466744508666479';
    const { hi, lo } = parseDoubleDouble(text);
    expect(hi).toBe(Number(text));
    expect(Math.abs(lo)).toBeGreaterThan(1e-18);
    // The rest of the exact decimal after both doubles is below half a unit in the last place of the second.
    expect(Math.abs(Rational.decimal(text).minus(Rational.sum({ hi, lo })).number())).toBeLessThan(1e-32);
  });

  it('reads signs, exponents and whole numbers', () => {
    expect(parseDoubleDouble('-4.113e-13')).toEqual({ hi: -4.113e-13, lo: expect.any(Number) });
    expect(parseDoubleDouble(' +12. ')).toEqual({ hi: 12, lo: 0 });
    expect(parseDoubleDouble('.5E1')).toEqual({ hi: 5, lo: 0 });
    expect(parseDoubleDouble('0.000')).toEqual({ hi: 0, lo: 0 });
    // 2⁵³ + 1 is no double.
    expect(parseDoubleDouble('9007199254740993')).toEqual({ hi: 9007199254740992, lo: 1 });
  });

  it.each(['', '.', '1,5', '0x10', '1e', 'NaN', '1e999', '12 3'])('refuses "%s"', (text) => {
    expect(() => parseDoubleDouble(text)).toThrow(`"${text}"`);
  });

  it('splits off the nearest whole number, halves upward', () => {
    expect(splitWhole({ hi: 7.5, lo: 0 })).toEqual({ whole: 8, rest: -0.5 });
    expect(splitWhole({ hi: 7.5, lo: -1e-17 })).toEqual({ whole: 8, rest: -0.5 });
    expect(splitWhole({ hi: 6e11, lo: -0.25 })).toEqual({ whole: 6e11, rest: -0.25 });
    expect(splitWhole({ hi: -2.5, lo: 0 })).toEqual({ whole: -2, rest: -0.5 });
  });
});

function pulsar(spin: Partial<PulsarModel['spin']>, glitches: readonly KnownGlitch[] = []): PulsarModel {
  return {
    name: 'KR 0000+00',
    rightAscensionRad: 0,
    declinationRad: 0,
    positionEpochMjd: 50000,
    properMotionMasPerYr: [0, 0],
    parallaxMas: 0,
    dispersionMeasure: 0,
    spin: {
      epochTdb: { day: 50000, fraction: 0.123456789 },
      frequencyHz: parseDoubleDouble('716.3579412345678901234'),
      frequencyDerivativeHzPerS: -4.1e-11,
      frequencySecondDerivativeHzPerS2: 1.7e-21,
      ...spin,
    },
    glitches,
    noise: {},
    alerts: { extraRecipients: [] },
  };
}

/** The polynomial in exact arithmetic. */
function exactPhase({ spin }: PulsarModel, tdb: Mjd): Rational {
  const days = Rational.of(tdb.day - spin.epochTdb.day).plus(
    Rational.of(tdb.fraction).minus(Rational.of(spin.epochTdb.fraction)),
  );
  const t = days.times(new Rational(86_400n, 1n));
  let power = t;
  let phase = Rational.of(spin.phaseAtEpochTurns ?? 0).plus(Rational.sum(spin.frequencyHz).times(t));
  const { frequencyDerivativeHzPerS, frequencySecondDerivativeHzPerS2, higherFrequencyDerivatives = [] } = spin;
  const derivatives = [frequencyDerivativeHzPerS, frequencySecondDerivativeHzPerS2, ...higherFrequencyDerivatives];
  for (const [i, derivative] of derivatives.entries()) {
    power = power.times(t).times(new Rational(1n, BigInt(i + 2)));
    phase = phase.plus(Rational.of(derivative).times(power));
  }
  return phase;
}

/** One turn a second, from MJD 50000. */
const clock = {
  epochTdb: { day: 50000, fraction: 0 },
  frequencyHz: { hi: 1, lo: 0 },
  frequencyDerivativeHzPerS: 0,
  frequencySecondDerivativeHzPerS2: 0,
};

describe('phase against the spin-down model', () => {
  const beyond = { higherFrequencyDerivatives: [-5.1e-31, 3e-40, -2e-49], phaseAtEpochTurns: 0.375 };
  it.each([
    ['with ν̇ and ν̈', pulsar({})],
    ['with derivatives up to the fifth and a phase at the epoch', pulsar(beyond)],
  ])('is right to 1e-7 turn over 40 years at 716 Hz, %s, against exact rational arithmetic', (_, model) => {
    const phaseAt = phaseEvaluator(model);
    let largest = 0;
    fc.assert(
      fc.property(
        fc.integer({ min: 50000 - 14610, max: 50000 + 14610 }),
        fc.double({ min: 0, max: 1, maxExcluded: true, noNaN: true }),
        (day, fraction) => {
          const exact = exactPhase(model, { day, fraction }).split();
          const got = phaseAt({ day, fraction });
          const difference = got.deviationTurns - exact.rest + Number(BigInt(got.pulseNumber) - exact.whole);
          largest = Math.max(largest, Math.abs(difference));
          expect(got.deviationTurns).toBeGreaterThanOrEqual(-0.5);
          expect(got.deviationTurns).toBeLessThan(0.5);
        },
      ),
      { seed: 7, numRuns: 2000 },
    );
    expect(largest).toBeLessThan(1e-9);
  });

  it('counts late as positive', () => {
    const phaseAt = phaseEvaluator(pulsar(clock));
    const late = phaseAt({ day: 50000, fraction: 10.1 / 86_400 });
    expect(late.pulseNumber).toBe(10);
    expect(late.deviationTurns).toBeCloseTo(0.1, 12);
    const early = phaseAt({ day: 50000, fraction: 9.9 / 86_400 });
    expect(early.deviationTurns).toBeCloseTo(-0.1, 12);
    expect(Object.is(phaseAt({ day: 50000, fraction: 0 }).pulseNumber, 0)).toBe(true);
  });

  const glitch: KnownGlitch = {
    epochTdb: { day: 50100, fraction: 0.25 },
    phaseTurns: 0.01,
    frequencyStepHz: 1e-6,
    frequencyDerivativeStepHzPerS: -1e-14,
    recoveries: [{ frequencyStepHz: 2e-7, timescaleDays: 20 }],
  };

  it('adds a known glitch after its epoch, by the formula of Yu et al. 2013, MNRAS 429, 688', () => {
    const smooth = pulsar({});
    const stepped = phaseEvaluator(pulsar({}, [glitch]));
    const tdb = { day: 50150, fraction: 0.5 };
    const t = 50.25 * 86_400;
    const tau = 20 * 86_400;
    const added = 0.01 + 1e-6 * t - 0.5e-14 * t * t + 2e-7 * tau * (1 - Math.exp(-t / tau));
    const before = phaseEvaluator(smooth)(tdb);
    const after = stepped(tdb);
    const difference = after.pulseNumber - before.pulseNumber + (after.deviationTurns - before.deviationTurns);
    expect(difference).toBeCloseTo(added, 9);
    expect(after.frequencyHz - before.frequencyHz).toBeCloseTo(1e-6 - 1e-14 * t + 2e-7 * Math.exp(-t / tau), 12);
    const earlier = { day: 50100, fraction: 0.25 };
    expect(stepped(earlier)).toEqual(phaseEvaluator(smooth)(earlier));
  });

  it('states a frequency that is the slope of the phase', () => {
    const phaseAt = phaseEvaluator(pulsar({ higherFrequencyDerivatives: [-5.1e-25, 3e-31] }, [glitch]));
    const a = phaseAt({ day: 50160, fraction: 0.4 });
    const b = phaseAt({ day: 50160, fraction: 0.6 });
    const turns = b.pulseNumber - a.pulseNumber + (b.deviationTurns - a.deviationTurns);
    const middle = phaseAt({ day: 50160, fraction: 0.5 });
    expect(turns / (0.2 * 86_400)).toBeCloseTo(middle.frequencyHz, 9);
    expect(glitchFrequency(glitch, 0)).toBeCloseTo(1.2e-6, 15);
  });

  it('sees a pulsar that spun up arrive early', () => {
    const phaseAt = phaseEvaluator(pulsar(clock));
    // Pulse 100 000 of a pulsar that gained 1e-6 of its ν at the epoch comes 0.1 s before that of the model.
    const seconds = 100_000 / (1 + 1e-6);
    const { pulseNumber, deviationTurns } = phaseAt({ day: 50001, fraction: seconds / 86_400 - 1 });
    expect(pulseNumber).toBe(100_000);
    expect(deviationTurns).toBeCloseTo(-0.1, 6);
  });
});
