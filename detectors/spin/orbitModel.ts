import type { Mjd } from '../time/mjd.ts';

/**
 * A binary orbit as the operator describes it. Times are those of the pulsar as seen from the centre of mass of the binary, in TDB:
 * an arrival at the barycentre at t is from t_e where t = t_e + Δ(t_e), Δ being the orbit's delay (see sky/orbit.ts).
 */
export type Orbit = KeplerianOrbit | SmallEccentricityOrbit;

export interface OrbitSize {
  /** At the orbit's epoch. */
  readonly periodDays: number;
  /** s/s */
  readonly periodDerivative: number;
  /** a sin i / c, light-seconds, at the orbit's epoch. */
  readonly projectedSemiMajorAxisS: number;
  /** light-seconds per second */
  readonly projectedSemiMajorAxisDerivative: number;
  /** G m₂/c³ of the companion, s; 0: no gravitational delay. */
  readonly shapiroRangeS: number;
  /** sin i */
  readonly shapiroShape: number;
}

/** Any eccentricity up to 0.99. The period is from periastron to periastron. */
export interface KeplerianOrbit extends OrbitSize {
  readonly form: 'keplerian';
  readonly periastronEpochTdb: Mjd;
  readonly eccentricity: number;
  readonly eccentricityDerivativePerS: number;
  /** ω at the epoch, from the ascending node. */
  readonly periastronLongitudeRad: number;
  readonly periastronAdvanceRadPerS: number;
  /** Amplitude γ of the time dilation and redshift along the orbit, s. */
  readonly einsteinDelayS: number;
}

/** For orbits so round that their periastron is ill known. The period is from ascending node to ascending node. */
export interface SmallEccentricityOrbit extends OrbitSize {
  readonly form: 'small eccentricity';
  readonly ascendingNodeEpochTdb: Mjd;
  /** Laplace parameter η = e sin ω. */
  readonly eccentricitySine: number;
  readonly eccentricitySineDerivativePerS: number;
  /** Laplace parameter κ = e cos ω. */
  readonly eccentricityCosine: number;
  readonly eccentricityCosineDerivativePerS: number;
}
