import { add, fromNumber, multiply, parseDoubleDouble } from '../../detectors/spin/doubleDouble.ts';
import type { KnownGlitch, Orbit, PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { addSeconds, daysBetween, type Mjd, SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';

/**
 * A spin-down model given in TCB, turned into the same model in TDB. IAU 2006 resolution B3 defines
 * TDB = TCB − L_B (JD_TCB − T_0) × 86400 s + TDB_0 with the exact constants below (values from memory).
 * Left alone, as in the resolution's own use: DM, parallax and proper motion, which would change by 1.6 parts in 10⁸ and so
 * move an arrival by a constant of at most some tens of ns.
 */
const L_B = parseDoubleDouble('1.550519768e-8');
/** T_0 = JD 2443144.5003725: 1977 January 1.0 TAI. */
const T_0: Mjd = { day: 43_144, fraction: 0.0003725 };
const TDB_0_S = -6.55e-5;

/** 1 / (1 − L_B), by its series; the next term is 6e-32. */
const RATE = [L_B, multiply(L_B, L_B), multiply(multiply(L_B, L_B), L_B)].reduce(add, fromNumber(1));
const RATE_NUMBER = RATE.hi;

export function tcbToTdb(tcb: Mjd): Mjd {
  return addSeconds(tcb, -L_B.hi * daysBetween(tcb, T_0) * SECONDS_PER_DAY + TDB_0_S);
}

/** Every derivative with respect to time takes one factor of dTCB/dTDB; a timescale takes its inverse. */
export function modelFromTcb(model: PulsarModel): PulsarModel {
  const { spin, orbit } = model;
  return {
    ...model,
    spin: {
      ...spin,
      epochTdb: tcbToTdb(spin.epochTdb),
      frequencyHz: multiply(spin.frequencyHz, RATE),
      frequencyDerivativeHzPerS: spin.frequencyDerivativeHzPerS * RATE_NUMBER ** 2,
      frequencySecondDerivativeHzPerS2: spin.frequencySecondDerivativeHzPerS2 * RATE_NUMBER ** 3,
      ...(spin.higherFrequencyDerivatives === undefined
        ? {}
        : {
            higherFrequencyDerivatives: spin.higherFrequencyDerivatives.map(
              (value, i) => value * RATE_NUMBER ** (i + 4),
            ),
          }),
    },
    ...(orbit === undefined ? {} : { orbit: orbitFromTcb(orbit) }),
    glitches: model.glitches.map(glitchFromTcb),
  };
}

/** Lengths are light times, and shrink as times do; what is s/s stays. */
function orbitFromTcb(orbit: Orbit): Orbit {
  const size = {
    periodDays: orbit.periodDays / RATE_NUMBER,
    projectedSemiMajorAxisS: orbit.projectedSemiMajorAxisS / RATE_NUMBER,
    shapiroRangeS: orbit.shapiroRangeS / RATE_NUMBER,
  };
  if (orbit.form === 'keplerian') {
    return {
      ...orbit,
      ...size,
      periastronEpochTdb: tcbToTdb(orbit.periastronEpochTdb),
      eccentricityDerivativePerS: orbit.eccentricityDerivativePerS * RATE_NUMBER,
      periastronAdvanceRadPerS: orbit.periastronAdvanceRadPerS * RATE_NUMBER,
      einsteinDelayS: orbit.einsteinDelayS / RATE_NUMBER,
    };
  }
  return {
    ...orbit,
    ...size,
    ascendingNodeEpochTdb: tcbToTdb(orbit.ascendingNodeEpochTdb),
    eccentricitySineDerivativePerS: orbit.eccentricitySineDerivativePerS * RATE_NUMBER,
    eccentricityCosineDerivativePerS: orbit.eccentricityCosineDerivativePerS * RATE_NUMBER,
  };
}

function glitchFromTcb(glitch: KnownGlitch): KnownGlitch {
  return {
    epochTdb: tcbToTdb(glitch.epochTdb),
    phaseTurns: glitch.phaseTurns,
    frequencyStepHz: glitch.frequencyStepHz * RATE_NUMBER,
    frequencyDerivativeStepHzPerS: glitch.frequencyDerivativeStepHzPerS * RATE_NUMBER ** 2,
    recoveries: glitch.recoveries.map(({ frequencyStepHz, timescaleDays }) => ({
      frequencyStepHz: frequencyStepHz * RATE_NUMBER,
      timescaleDays: timescaleDays / RATE_NUMBER,
    })),
  };
}
