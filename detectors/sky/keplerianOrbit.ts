import type { KeplerianOrbit } from '../spin/orbitModel.ts';
import { type Mjd, SECONDS_PER_DAY } from '../time/mjd.ts';
import { eccentricAnomaly, trueAnomaly } from './kepler.ts';
import { orbitPhase } from './orbitPhase.ts';

/** The largest that a model may have; a drifting one is held there. */
export const LARGEST_ECCENTRICITY = 0.99;

/** Straight behind the companion's centre the law has no meaning; held there it stays finite. */
export const SMALLEST_SHAPIRO_ARGUMENT = 1e-10;

/**
 * Delay of a pulse emitted at `emission`, s: Roemer, Einstein and Shapiro delay along an eccentric orbit,
 *
 *     Δ_R = x [sin ω (cos u − e) + √(1 − e²) cos ω sin u]
 *     Δ_E = γ sin u
 *     Δ_S = −2 r ln{1 − e cos u − s [sin ω (cos u − e) + √(1 − e²) cos ω sin u]}
 *
 * with u − e sin u = 2π (τ/P − ½ Ṗ (τ/P)²) and ω = ω₀ + (ω̇ P/2π) A, A being the true anomaly counted through
 * (Damour & Deruelle 1986, Ann. Inst. H. Poincaré 44, 263; the deformation of the orbit, δ_r and δ_θ, and aberration are left out).
 */
export function keplerianDelayS(orbit: KeplerianOrbit, emission: Mjd): number {
  const phase = orbitPhase(orbit, orbit.periastronEpochTdb, emission);
  const since = phase.secondsSinceEpoch;
  const drifted = orbit.eccentricity + orbit.eccentricityDerivativePerS * since;
  const e = Math.min(Math.max(drifted, 0), LARGEST_ECCENTRICITY);
  const u = eccentricAnomaly(phase.angleRad, e);
  const anomaly = trueAnomaly(u, e) + 2 * Math.PI * phase.whole;
  const advancePerRad = (orbit.periastronAdvanceRadPerS * orbit.periodDays * SECONDS_PER_DAY) / (2 * Math.PI);
  const omega = orbit.periastronLongitudeRad + advancePerRad * anomaly;
  const sinU = Math.sin(u);
  const cosU = Math.cos(u);
  // The distance along the line of sight, in units of the semi-major axis times sin i.
  const along = Math.sin(omega) * (cosU - e) + Math.sqrt(1 - e * e) * Math.cos(omega) * sinU;
  const axisS = orbit.projectedSemiMajorAxisS + orbit.projectedSemiMajorAxisDerivative * since;
  const lit = Math.max(1 - e * cosU - orbit.shapiroShape * along, SMALLEST_SHAPIRO_ARGUMENT);
  return axisS * along + orbit.einsteinDelayS * sinU - 2 * orbit.shapiroRangeS * Math.log(lit);
}
