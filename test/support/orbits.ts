import type { KeplerianOrbit, SmallEccentricityOrbit } from '../../detectors/spin/orbitModel.ts';
import { addSeconds, type Mjd } from '../../detectors/time/mjd.ts';

/** An eccentric orbit of 7.75 hours; no relativistic term unless a test adds it. */
export function keplerianOrbit(given: Partial<KeplerianOrbit> = {}): KeplerianOrbit {
  return {
    form: 'keplerian',
    periodDays: 0.323,
    periodDerivative: 0,
    projectedSemiMajorAxisS: 2.34,
    projectedSemiMajorAxisDerivative: 0,
    shapiroRangeS: 0,
    shapiroShape: 0,
    periastronEpochTdb: { day: 58_000, fraction: 0.4 },
    eccentricity: 0.617,
    eccentricityDerivativePerS: 0,
    periastronLongitudeRad: 3.9,
    periastronAdvanceRadPerS: 0,
    einsteinDelayS: 0,
    ...given,
  };
}

/** The same orbit in Laplace parameters; the ascending node is passed ω P/2π before periastron. */
export function inLaplaceParameters(orbit: KeplerianOrbit): SmallEccentricityOrbit {
  const { periodDays, periodDerivative, projectedSemiMajorAxisS, projectedSemiMajorAxisDerivative } = orbit;
  const beforeS = (orbit.periastronLongitudeRad / (2 * Math.PI)) * periodDays * 86_400;
  return {
    form: 'small eccentricity',
    periodDays,
    periodDerivative,
    projectedSemiMajorAxisS,
    projectedSemiMajorAxisDerivative,
    shapiroRangeS: orbit.shapiroRangeS,
    shapiroShape: orbit.shapiroShape,
    ascendingNodeEpochTdb: addSeconds(orbit.periastronEpochTdb, -beforeS),
    eccentricitySine: orbit.eccentricity * Math.sin(orbit.periastronLongitudeRad),
    eccentricitySineDerivativePerS: 0,
    eccentricityCosine: orbit.eccentricity * Math.cos(orbit.periastronLongitudeRad),
    eccentricityCosineDerivativePerS: 0,
  };
}

/** Where a pulsar is, seen from its companion, in units of the semi-major axis: along the line of sight (far is positive) over sin i. */
export interface IntegratedPlace {
  readonly emission: Mjd;
  readonly along: number;
  readonly distance: number;
}

/** Leaves 1e-12 of the semi-major axis at the eccentricities of the tests. */
export const STEPS_PER_ORBIT = 30_000;

/**
 * The orbit by direct integration of its equation of motion (fourth-order Runge-Kutta) from the periastron at the epoch: gravity, and an
 * inverse-cube force that turns the periastron by ω̇ and leaves all else as it is (Newton, Principia I, propositions 43-45).
 */
export function integratedOrbit(orbit: KeplerianOrbit, orbits: number, places: number): IntegratedPlace[] {
  const periodS = orbit.periodDays * 86_400;
  const e = orbit.eccentricity;
  // Units: semi-major axis, and period/2π.
  const advance = (orbit.periastronAdvanceRadPerS * periodS) / (2 * Math.PI);
  const momentum = Math.sqrt(1 - e * e) * (1 + advance);
  const inverseCube = momentum * momentum - (1 - e * e);
  const step = (2 * Math.PI) / STEPS_PER_ORBIT;
  const rate = ([x, y, vx, vy]: readonly number[]): number[] => {
    const square = x! * x! + y! * y!;
    const pull = -1 / (square * Math.sqrt(square)) - inverseCube / (square * square);
    return [vx!, vy!, pull * x!, pull * y!];
  };
  let state = [1 - e, 0, 0, momentum / (1 - e)];
  const result: IntegratedPlace[] = [];
  const total = Math.round(orbits * STEPS_PER_ORBIT);
  const every = Math.floor(total / places);
  for (let i = 0; i <= total; i++) {
    if (i % every === 0) {
      const [x, y] = [state[0]!, state[1]!];
      const { periastronLongitudeRad: omega, periastronEpochTdb } = orbit;
      result.push({
        emission: addSeconds(periastronEpochTdb, (i / STEPS_PER_ORBIT) * periodS),
        along: y * Math.cos(omega) + x * Math.sin(omega),
        distance: Math.hypot(x, y),
      });
    }
    state = rungeKutta(rate, state, step);
  }
  return result;
}

function rungeKutta(rate: (state: readonly number[]) => number[], state: readonly number[], step: number): number[] {
  const moved = (by: readonly number[], part: number) => state.map((value, i) => value + part * step * by[i]!);
  const a = rate(state);
  const b = rate(moved(a, 0.5));
  const c = rate(moved(b, 0.5));
  const d = rate(moved(c, 1));
  return state.map((value, i) => value + (step / 6) * (a[i]! + 2 * b[i]! + 2 * c[i]! + d[i]!));
}
