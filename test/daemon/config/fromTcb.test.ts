import { describe, expect, it } from 'vitest';
import { modelFromTcb, tcbToTdb } from '../../../daemon/config/fromTcb.ts';
import { orbitDelayS } from '../../../detectors/sky/orbit.ts';
import { parseDoubleDouble } from '../../../detectors/spin/doubleDouble.ts';
import type { DoubleDouble, PulsarModel } from '../../../detectors/spin/pulsarModel.ts';
import { daysBetween, type Mjd } from '../../../detectors/time/mjd.ts';
import { inLaplaceParameters, keplerianOrbit } from '../../support/orbits.ts';

/** 1 − L_B of IAU 2006 resolution B3 as a fraction of whole numbers. */
const ONE = 10n ** 18n;
const SLOWED = ONE - 15_505_197_680n;

/** A double-double as a whole number of units of 10⁻⁴⁰. */
function scaled({ hi, lo }: DoubleDouble): bigint {
  return [hi, lo].reduce((sum, part) => {
    let value = part;
    let doublings = 0n;
    while (!Number.isInteger(value)) {
      value *= 2;
      doublings += 1n;
    }
    return sum + (BigInt(value) * 10n ** 40n) / 2n ** doublings;
  }, 0n);
}

const MODEL: PulsarModel = {
  name: 'KR 1',
  rightAscensionRad: 1,
  declinationRad: 0.5,
  positionEpochMjd: 58000,
  properMotionMasPerYr: [0, 0],
  parallaxMas: 0,
  dispersionMeasure: 10,
  spin: {
    epochTdb: { day: 58000, fraction: 0.25 },
    frequencyHz: parseDoubleDouble('205.53069900312399565'),
    frequencyDerivativeHzPerS: -4e-13,
    frequencySecondDerivativeHzPerS2: 1e-24,
  },
  glitches: [
    {
      epochTdb: { day: 58100, fraction: 0 },
      phaseTurns: 0.1,
      frequencyStepHz: 1e-6,
      frequencyDerivativeStepHzPerS: -1e-14,
      recoveries: [{ frequencyStepHz: 1e-7, timescaleDays: 30 }],
    },
  ],
  noise: {},
  alerts: { extraRecipients: [] },
};

describe('TCB to TDB (IAU 2006 resolution B3)', () => {
  it("gives the IAU SOFA library's own check value for TCB to TDB (from memory)", () => {
    const tdb = tcbToTdb({ day: 53_750, fraction: 0.893019599 });
    expect(tdb.day).toBe(53_750);
    expect(Math.abs(tdb.fraction - 0.8928551362746343)).toBeLessThan(1e-14);
  });

  it('agrees at the common origin up to TDB_0', () => {
    const origin: Mjd = { day: 43_144, fraction: 0.0003725 };
    expect(daysBetween(tcbToTdb(origin), origin) * 86_400).toBeCloseTo(-6.55e-5, 10);
  });

  it('keeps the frequency to 30 digits, against whole-number arithmetic', () => {
    const exact = (scaled(MODEL.spin.frequencyHz) * ONE) / SLOWED;
    const error = scaled(modelFromTcb(MODEL).spin.frequencyHz) - exact;
    expect(error < 10n ** 12n && error > -(10n ** 12n)).toBe(true);
  });

  it('keeps the phase between two events, known glitch and recovery included', () => {
    const start: Mjd = { day: 58_000, fraction: 0.25 };
    const later: Mjd = { day: 58_150, fraction: 0.5 };
    const tcb = turnsBetween(MODEL, start, later);
    const tdb = turnsBetween(modelFromTcb(MODEL), tcbToTdb(start), tcbToTdb(later));
    // 2.7e9 turns: one double and the 1e-16 d of the dates leave some 1e-6.
    expect(Math.abs(tdb - tcb)).toBeLessThan(5e-6);
  });

  const drifting = { periodDerivative: -2e-12, projectedSemiMajorAxisDerivative: 1e-14, shapiroRangeS: 6e-6 };
  const keplerian = keplerianOrbit({
    ...drifting,
    shapiroShape: 0.9,
    eccentricityDerivativePerS: 1e-15,
    periastronAdvanceRadPerS: 2.3e-9,
    einsteinDelayS: 0.004,
  });
  const laplace = {
    ...inLaplaceParameters({ ...keplerian, eccentricity: 0.001 }),
    eccentricitySineDerivativePerS: 1e-14,
    eccentricityCosineDerivativePerS: 2e-14,
  };
  it.each([keplerian, laplace])(
    'keeps the light path across an orbit ($form), told in seconds of either kind',
    (orbit) => {
      const turned = modelFromTcb({ ...MODEL, orbit }).orbit!;
      const slowed = Number(SLOWED) / Number(ONE);
      for (const day of [56_000, 58_001, 60_500]) {
        for (const fraction of [0.1, 0.45, 0.8]) {
          const tcb = { day, fraction };
          expect(Math.abs(orbitDelayS(turned, tcbToTdb(tcb)) - orbitDelayS(orbit, tcb) * slowed)).toBeLessThan(2e-10);
        }
      }
    },
  );

  it('turns the derivatives beyond the second', () => {
    const spin = { ...MODEL.spin, higherFrequencyDerivatives: [2e-30, 3e-40], phaseAtEpochTurns: 0.25 };
    const turned = modelFromTcb({ ...MODEL, spin }).spin;
    expect(turned.phaseAtEpochTurns).toBe(0.25);
    const [third, fourth] = turned.higherFrequencyDerivatives!;
    expect(third! / 2e-30 - 1).toBeCloseTo(4 * 1.550519768e-8, 13);
    expect(fourth! / 3e-40 - 1).toBeCloseTo(5 * 1.550519768e-8, 13);
  });
});

function turnsBetween({ spin, glitches }: PulsarModel, start: Mjd, end: Mjd): number {
  const seconds = daysBetween(end, start) * 86_400;
  let turns =
    spin.frequencyHz.hi * seconds +
    (spin.frequencyDerivativeHzPerS * seconds ** 2) / 2 +
    (spin.frequencySecondDerivativeHzPerS2 * seconds ** 3) / 6;
  for (const glitch of glitches) {
    const since = daysBetween(end, glitch.epochTdb) * 86_400;
    turns +=
      glitch.phaseTurns + glitch.frequencyStepHz * since + (glitch.frequencyDerivativeStepHzPerS * since ** 2) / 2;
    for (const { frequencyStepHz, timescaleDays } of glitch.recoveries) {
      const timescale = timescaleDays * 86_400;
      turns += frequencyStepHz * timescale * (1 - Math.exp(-since / timescale));
    }
  }
  return turns;
}
