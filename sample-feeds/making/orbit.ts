import { type Mjd, mjdNumber } from '../../detectors/time/mjd.ts';
import type { InventedOrbit } from './pulsars.ts';

/**
 * Light time across a Kepler orbit, seconds, positive on the far side, as a function of the time of emission:
 * x (sin ω (cos E − e) + cos ω √(1 − e²) sin E), with E from Kepler's equation (textbook).
 */
export function orbitDelay(orbit: InventedOrbit): (emitted: Mjd) => number {
  const { periodDays, semiMajorAxisLightS, eccentricity, periastronLongitudeDeg, periastronMjd } = orbit;
  const omega = (periastronLongitudeDeg * Math.PI) / 180;
  const minorOverMajor = Math.sqrt(1 - eccentricity ** 2);
  return (emitted) => {
    // A double holds an MJD to 1e-11 d: 1 µs, in which nothing moves by more than a nanosecond.
    const anomaly = 2 * Math.PI * ((mjdNumber(emitted) - periastronMjd) / periodDays);
    const e = eccentricAnomaly(anomaly, eccentricity);
    return (
      semiMajorAxisLightS *
      (Math.sin(omega) * (Math.cos(e) - eccentricity) + Math.cos(omega) * minorOverMajor * Math.sin(e))
    );
  };
}

/** Newton's method from the mean anomaly, for orbits that are not long drawn out. */
function eccentricAnomaly(meanAnomaly: number, eccentricity: number): number {
  let e = meanAnomaly;
  for (let round = 0; round < 10; round++) {
    e -= (e - eccentricity * Math.sin(e) - meanAnomaly) / (1 - eccentricity * Math.cos(e));
  }
  return e;
}
