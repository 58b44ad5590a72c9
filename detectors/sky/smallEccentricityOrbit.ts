import type { SmallEccentricityOrbit } from '../spin/orbitModel.ts';
import type { Mjd } from '../time/mjd.ts';
import { SMALLEST_SHAPIRO_ARGUMENT } from './keplerianOrbit.ts';
import { orbitPhase } from './orbitPhase.ts';

/**
 * Delay of a pulse emitted at `emission`, s, in the Laplace parameters η = e sin ω and κ = e cos ω and the phase Φ from the ascending node
 * (Lange et al. 2001, MNRAS 326, 274, eq. A6), with the next order of the same expansion:
 *
 *     Δ_R/x = sin Φ + ½ (κ sin 2Φ − η cos 2Φ)
 *             − ⅛ [(3η² + 5κ²) sin Φ − 2ηκ cos Φ + 3(η² − κ²) sin 3Φ + 6ηκ cos 3Φ]
 *
 * The constant −3/2 x η is left out, as there: it belongs to the phase. What is left out beyond is x e³. The Shapiro delay has its
 * argument to second order too.
 */
export function smallEccentricityDelayS(orbit: SmallEccentricityOrbit, emission: Mjd): number {
  const phase = orbitPhase(orbit, orbit.ascendingNodeEpochTdb, emission);
  const since = phase.secondsSinceEpoch;
  const eta = orbit.eccentricitySine + orbit.eccentricitySineDerivativePerS * since;
  const kappa = orbit.eccentricityCosine + orbit.eccentricityCosineDerivativePerS * since;
  const phi = phase.angleRad;
  const [sin1, sin2, sin3] = [Math.sin(phi), Math.sin(2 * phi), Math.sin(3 * phi)];
  const [cos1, cos2, cos3] = [Math.cos(phi), Math.cos(2 * phi), Math.cos(3 * phi)];
  const second =
    (3 * eta * eta + 5 * kappa * kappa) * sin1 -
    2 * eta * kappa * cos1 +
    3 * (eta * eta - kappa * kappa) * sin3 +
    6 * eta * kappa * cos3;
  const along = sin1 + (kappa * sin2 - eta * cos2) / 2 - second / 8;
  const axisS = orbit.projectedSemiMajorAxisS + orbit.projectedSemiMajorAxisDerivative * since;
  const roemer = axisS * along;
  if (orbit.shapiroRangeS === 0) return roemer;
  // Distance from the companion over the semi-major axis, 1 − e cos u, in the same parameters.
  const distance =
    1 -
    (kappa * cos1 + eta * sin1) +
    (eta * eta + kappa * kappa - (kappa * kappa - eta * eta) * cos2 - 2 * eta * kappa * sin2) / 2;
  const lit = Math.max(distance - orbit.shapiroShape * (along - 1.5 * eta), SMALLEST_SHAPIRO_ARGUMENT);
  return roemer - 2 * orbit.shapiroRangeS * Math.log(lit);
}
