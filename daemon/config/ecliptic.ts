import { RADIANS_PER_ARCSECOND } from '../../detectors/sky/constants.ts';
import { dot, type Vector } from '../../detectors/sky/vector.ts';
import type { Position } from './position.ts';

/** Obliquity of the ecliptic at J2000.0, arc seconds: IAU 2006 resolution B1 and IERS Conventions 2010. */
export const OBLIQUITY_ARCSEC = 84_381.406;

/**
 * A position in the ecliptic of J2000.0 as pulsar models use it: the ICRS turned about its x axis by the obliquity alone. (The 0.05″ by
 * which the dynamical equinox is off does not enter: it is a convention, and the same one the numbers were made with.)
 */
export interface EclipticPosition {
  readonly longitudeRad: number;
  readonly latitudeRad: number;
  /** [λ cos β, β] */
  readonly properMotionMasPerYr: readonly [number, number];
  readonly obliquityArcsec: number;
}

/** The same place and motion in ICRS: the motion is turned as the vector that it is. */
export function equatorialFromEcliptic(ecliptic: EclipticPosition): Position {
  const obliquity = ecliptic.obliquityArcsec * RADIANS_PER_ARCSECOND;
  const turned = ([x, y, z]: Vector): Vector => [
    x,
    y * Math.cos(obliquity) - z * Math.sin(obliquity),
    y * Math.sin(obliquity) + z * Math.cos(obliquity),
  ];
  const here = axesAt(ecliptic.longitudeRad, ecliptic.latitudeRad);
  const [x, y, z] = turned(here.towards);
  const rightAscension = Math.atan2(y, x);
  const rightAscensionRad = rightAscension < 0 ? rightAscension + 2 * Math.PI : rightAscension;
  const declinationRad = Math.atan2(z, Math.hypot(x, y));
  const there = axesAt(rightAscensionRad, declinationRad);
  const [alongEast, alongNorth] = ecliptic.properMotionMasPerYr;
  const [east, north] = [turned(here.east), turned(here.north)];
  return {
    rightAscensionRad,
    declinationRad,
    properMotionMasPerYr: [
      alongEast * dot(east, there.east) + alongNorth * dot(north, there.east),
      alongEast * dot(east, there.north) + alongNorth * dot(north, there.north),
    ],
  };
}

/** Unit vectors towards a place on the sphere, and on it along growing longitude and latitude. */
function axesAt(longitude: number, latitude: number): { towards: Vector; east: Vector; north: Vector } {
  const [sinLon, cosLon] = [Math.sin(longitude), Math.cos(longitude)];
  const [sinLat, cosLat] = [Math.sin(latitude), Math.cos(latitude)];
  return {
    towards: [cosLat * cosLon, cosLat * sinLon, sinLat],
    east: [-sinLon, cosLon, 0],
    north: [-sinLat * cosLon, -sinLat * sinLon, cosLat],
  };
}
