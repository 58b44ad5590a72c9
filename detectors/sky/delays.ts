import type { PulsarModel } from '../spin/pulsarModel.ts';
import type { Mjd } from '../time/mjd.ts';
import {
  AU_KM,
  DAYS_PER_JULIAN_YEAR,
  DISPERSION_CONSTANT,
  LIGHT_KM_PER_S,
  PARSEC_KM,
  RADIANS_PER_MAS,
  SUN_MASS_S,
} from './constants.ts';
import { dot, magnitude, scaled, sum, type Vector } from './vector.ts';

/** What the delays need of a pulsar, with its sines and cosines taken once. */
export interface PulsarDirection {
  /** Unit vector (ICRS) at the position epoch. */
  readonly towards: Vector;
  /** Proper motion on the sky, rad/day. */
  readonly motionPerDay: Vector;
  readonly positionEpochMjd: number;
  /** 1 / (2 c d), s/km²; 0 when the parallax is 0. */
  readonly curvatureSPerKm2: number;
  /** pc cm⁻³ at the epoch of its slope. */
  readonly dispersionMeasure: number;
  /** pc cm⁻³ per day */
  readonly dispersionSlopePerDay: number;
  readonly dispersionEpochMjd: number;
  /** Electrons per cm³ at 1 au. */
  readonly solarWindPerCm3: number;
}

export function pulsarDirection(model: PulsarModel): PulsarDirection {
  const sinRa = Math.sin(model.rightAscensionRad);
  const cosRa = Math.cos(model.rightAscensionRad);
  const sinDec = Math.sin(model.declinationRad);
  const cosDec = Math.cos(model.declinationRad);
  const perDay = RADIANS_PER_MAS / DAYS_PER_JULIAN_YEAR;
  const east = scaled([-sinRa, cosRa, 0], model.properMotionMasPerYr[0] * perDay);
  const north = scaled([-sinDec * cosRa, -sinDec * sinRa, cosDec], model.properMotionMasPerYr[1] * perDay);
  return {
    towards: [cosDec * cosRa, cosDec * sinRa, sinDec],
    motionPerDay: sum(east, north),
    positionEpochMjd: model.positionEpochMjd,
    curvatureSPerKm2: (model.parallaxMas * RADIANS_PER_MAS) / (2 * LIGHT_KM_PER_S * AU_KM),
    dispersionMeasure: model.dispersionMeasure,
    dispersionSlopePerDay: (model.dispersionMeasureSlope?.perYr ?? 0) / DAYS_PER_JULIAN_YEAR,
    dispersionEpochMjd: model.dispersionMeasureSlope?.epochMjd ?? 0,
    solarWindPerCm3: model.solarWindPerCm3 ?? 0,
  };
}

/** Unit vector to the pulsar at a date: uniform motion along the tangent at the epoch, no radial velocity. */
export function directionAt(pulsar: PulsarDirection, tdb: Mjd): Vector {
  const days = tdb.day - pulsar.positionEpochMjd + tdb.fraction;
  const moved = sum(pulsar.towards, scaled(pulsar.motionPerDay, days));
  return scaled(moved, 1 / magnitude(moved));
}

/**
 * Light path from the observer to the barycentre, s, to be added: n·r/c − (r² − (n·r)²)/(2 c d), the second term being the curvature of the
 * wave front (at most 1.2 µs at 1 kpc). The next order in r/d is below 1 ps.
 */
export function roemerS(pulsar: PulsarDirection, direction: Vector, observerKm: Vector): number {
  const along = dot(direction, observerKm);
  const acrossSquared = dot(observerKm, observerKm) - along * along;
  return along / LIGHT_KM_PER_S - pulsar.curvatureSPerKm2 * acrossSquared;
}

/**
 * The Sun's gravitational delay, s, to be subtracted: −2 GM☉/c³ ln(1 + cos θ), θ between the pulsar and the observer as seen from the
 * Sun (Shapiro 1964; Backer & Hellings 1986, ARA&A 24, 537). A constant is left in the phase. Jupiter's ≤ 0.2 µs is neglected.
 */
export function sunShapiroS(direction: Vector, observerFromSunKm: Vector): number {
  const distance = magnitude(observerFromSunKm);
  // Behind the Sun's disc the law has no meaning; held at the limb (0.27°) it stays finite.
  const oneCosine = Math.max(1 + dot(direction, observerFromSunKm) / distance, 1.1e-5);
  return -2 * SUN_MASS_S * Math.log(oneCosine);
}

/** The interstellar dispersion measure at a date, pc cm⁻³. */
export function dispersionMeasureAt(pulsar: PulsarDirection, tdb: Mjd): number {
  const days = tdb.day - pulsar.dispersionEpochMjd + tdb.fraction;
  return pulsar.dispersionMeasure + pulsar.dispersionSlopePerDay * days;
}

/** The solar wind's angle is held at the Sun's limb seen from 1 au (0.27°). */
const LARGEST_WIND_ANGLE = Math.PI - 0.004652;

/**
 * What the solar wind adds to the dispersion measure, pc cm⁻³, for electrons that thin out as n₀ (1 au/r)²: added up along the line of
 * sight (an elementary integral) n₀ au² ρ/(r sin ρ), with ρ between the pulsar and the observer as seen from the Sun. The real wind
 * differs by up to 0.3 µs at 1.4 GHz within 20° of the Sun (Tiburzi et al. 2019, MNRAS 487, 394).
 */
export function solarWindMeasure(perCm3: number, direction: Vector, observerFromSunKm: Vector): number {
  if (perCm3 === 0) return 0;
  const distance = magnitude(observerFromSunKm);
  const cosine = dot(direction, observerFromSunKm) / distance;
  const rho = Math.min(Math.acos(Math.min(1, Math.max(-1, cosine))), LARGEST_WIND_ANGLE);
  const path = rho < 1e-6 ? 1 : rho / Math.sin(rho);
  return (perCm3 * AU_KM * (AU_KM / distance) * path) / PARSEC_KM;
}

/**
 * Dispersion delay, s, to be subtracted: K·DM/f² with the observing frequency brought to the barycentre by the Doppler factor
 * 1 − n·v/c. f = ∞ gives 0.
 */
export function dispersionS(dispersionMeasure: number, frequencyMhz: number, speedTowardsKmPerS: number): number {
  const frequency = frequencyMhz * (1 - speedTowardsKmPerS / LIGHT_KM_PER_S);
  return (DISPERSION_CONSTANT * dispersionMeasure) / (frequency * frequency);
}
