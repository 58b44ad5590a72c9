/**
 * Kepler's equation u − e sin u = M for |M| ≤ π and 0 ≤ e < 1: the eccentric anomaly u, rad, to a few units in the last place.
 *
 * On [0, π] the left side is rising and convex, so Newton's method started at or above the root comes down to it without fail. Each of
 * π, M + e and M/(1 − e) is such a start.
 */
export function eccentricAnomaly(meanAnomaly: number, eccentricity: number): number {
  const target = Math.abs(meanAnomaly);
  let u = Math.min(Math.PI, target + eccentricity, target / (1 - eccentricity));
  for (;;) {
    const next = u - (u - eccentricity * Math.sin(u) - target) / (1 - eccentricity * Math.cos(u));
    if (!(next < u)) break;
    u = next;
  }
  return meanAnomaly < 0 ? -u : u;
}

/** The true anomaly that belongs to an eccentric anomaly, both in [−π, π]. */
export function trueAnomaly(u: number, eccentricity: number): number {
  return 2 * Math.atan2(Math.sqrt(1 + eccentricity) * Math.sin(u / 2), Math.sqrt(1 - eccentricity) * Math.cos(u / 2));
}
