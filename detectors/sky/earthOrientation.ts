import type { Quality } from '../arrival.ts';
import type { Mjd } from '../time/mjd.ts';
import { firstAfter } from '../time/risingDates.ts';
import { J2000_MJD, RADIANS_PER_ARCSECOND } from './constants.ts';
import { nutation } from './nutation.ts';
import type { Vector } from './vector.ts';

/** Measured orientation of the Earth (IERS), one row a day, rising dates. */
export interface EarthOrientationTable {
  readonly name: string;
  readonly mjdUtc: Float64Array;
  readonly ut1MinusUtcS: Float64Array;
  /** Polar motion. */
  readonly xArcsec: Float64Array;
  readonly yArcsec: Float64Array;
}

export interface EarthOrientation {
  readonly ut1MinusUtcS: number;
  readonly xArcsec: number;
  readonly yArcsec: number;
  readonly quality: Quality;
  readonly reason: string;
}

/** Without a table: costs at most 1.4 µs (|UT1 − UTC| ≤ 0.9 s × 465 m/s / c) and 52 ns (polar motion 0.5″). Not marked: it is the operator's choice. */
const NO_TABLE: EarthOrientation = { ut1MinusUtcS: 0, xArcsec: 0, yArcsec: 0, quality: 'ok', reason: '' };

/** Straight lines between the rows; outside the table its end values are held and the answer is marked `extrapolated`. */
export function earthOrientationAt(table: EarthOrientationTable | null, utc: Mjd): EarthOrientation {
  if (table === null || table.mjdUtc.length === 0) return NO_TABLE;
  const { mjdUtc, ut1MinusUtcS, xArcsec, yArcsec } = table;
  const at = utc.day + utc.fraction;
  const last = mjdUtc.length - 1;
  if (at < mjdUtc[0]! || at > mjdUtc[last]!) {
    const end = at < mjdUtc[0]! ? 0 : last;
    const what = end === 0 ? 'begins' : 'ended';
    const reason = `Earth orientation table ${table.name} ${what} at MJD ${mjdUtc[end]}; its end values are held`;
    const held = { ut1MinusUtcS: ut1MinusUtcS[end]!, xArcsec: xArcsec[end]!, yArcsec: yArcsec[end]! };
    return { ...held, quality: 'extrapolated', reason };
  }
  const right = Math.min(last, firstAfter(mjdUtc, at));
  const left = Math.max(0, right - 1);
  const span = mjdUtc[right]! - mjdUtc[left]!;
  const share = span === 0 ? 0 : (at - mjdUtc[left]!) / span;
  // A leap second at the end of the day makes UT1 − UTC jump by a second: UT1 itself does not.
  const step = ut1MinusUtcS[right]! - ut1MinusUtcS[left]!;
  return {
    ut1MinusUtcS: ut1MinusUtcS[left]! + share * (step - Math.round(step)),
    xArcsec: xArcsec[left]! + share * (xArcsec[right]! - xArcsec[left]!),
    yArcsec: yArcsec[left]! + share * (yArcsec[right]! - yArcsec[left]!),
    quality: 'ok',
    reason: '',
  };
}

/** Turns of the Earth in a day of UT1, beyond one (IERS Conventions 2010, eq. 5.15). */
const EXTRA_TURNS_PER_DAY = 0.00273781191135448;

/**
 * Earth rotation angle, radians in [0, 2π): IAU 2000 resolution B1.8 (Capitaine et al. 2000; IERS Conventions 2010, eq. 5.15).
 */
export function earthRotationAngle(ut1: Mjd): number {
  const days = ut1.day - J2000_MJD + ut1.fraction;
  // Whole days turn the Earth by whole turns: only the part of the day counts.
  const turns = ut1.fraction + 0.5 + 0.779057273264 - 1 + EXTRA_TURNS_PER_DAY * days;
  return 2 * Math.PI * (turns - Math.floor(turns));
}

/** The Celestial Intermediate Pole in the GCRS (unit vector's X, Y) and the origin locator s, radians. */
export interface IntermediatePole {
  readonly x: number;
  readonly y: number;
  readonly s: number;
}

/**
 * IAU 2006 precession (Fukushima–Williams angles; Hilton et al. 2006, Celest. Mech. Dyn. Astron. 94, 351) with IAU 2000B nutation.
 * The small adjustment of the nutation to the 2006 precession (< 0.02 mas) is left out.
 *
 * @param t Julian centuries of TT since J2000.0.
 */
export function intermediatePole(t: number): IntermediatePole {
  const { longitudeRad, obliquityRad, nodeRad } = nutation(t);
  const gamma = arcseconds(t, -0.052928, 10.556378, 0.4932044, -0.00031238, -2.788e-6, 2.6e-8);
  const phi = arcseconds(t, 84381.412819, -46.811016, 0.0511268, 0.00053289, -4.4e-7, -1.76e-8);
  const psi = longitudeRad + arcseconds(t, -0.041775, 5038.481484, 1.5584175, -0.00018522, -2.6452e-5, -1.48e-8);
  const epsilon = obliquityRad + arcseconds(t, 84381.406, -46.836769, -0.0001831, 0.0020034, -5.76e-7, -4.34e-8);
  const sinEpsilon = Math.sin(epsilon);
  const cosEpsilon = Math.cos(epsilon);
  const sinPhi = Math.sin(phi);
  const cosPhi = Math.cos(phi);
  const a = sinEpsilon * Math.sin(psi);
  const b = sinEpsilon * Math.cos(psi) * cosPhi - cosEpsilon * sinPhi;
  const sinGamma = Math.sin(gamma);
  const cosGamma = Math.cos(gamma);
  const x = a * cosGamma - b * sinGamma;
  const y = a * sinGamma + b * cosGamma;
  return { x, y, s: originLocator(t, nodeRad) - (x * y) / 2 };
}

function arcseconds(t: number, c0: number, c1: number, c2: number, c3: number, c4: number, c5: number): number {
  return (c0 + t * (c1 + t * (c2 + t * (c3 + t * (c4 + t * c5))))) * RADIANS_PER_ARCSECOND;
}

/** s + XY/2: IERS Conventions 2010, table 5.2d, without its terms below 0.1 mas (together < 0.3 mas: 0.03 ns of light travel). */
function originLocator(t: number, node: number): number {
  const microarcseconds =
    94 + t * (3808.65 - t * (122.68 + t * 72574.11)) - 2640.73 * Math.sin(node) - 63.53 * Math.sin(2 * node);
  return microarcseconds * 1e-6 * RADIANS_PER_ARCSECOND;
}

export interface SiteMotion {
  readonly positionKm: Vector;
  readonly velocityKmPerS: Vector;
}

/** rad/s. */
const ROTATION_RAD_PER_S = (2 * Math.PI * (1 + EXTRA_TURNS_PER_DAY)) / 86_400;

/**
 * A site fixed to the Earth, seen from the geocentre in the GCRS.
 *
 * @param itrfM Site, ITRF, m. @param tt Sets precession and nutation. @param ut1 Sets the rotation.
 *
 * The terrestrial origin locator s′ (< 0.1 mas) is left out; polar motion is taken to first order (0.02 mm).
 */
export function siteInGcrs(
  itrfM: readonly [number, number, number],
  tt: Mjd,
  ut1: Mjd,
  poleXArcsec: number,
  poleYArcsec: number,
): SiteMotion {
  const [xi, yi, zi] = itrfM;
  const poleX = poleXArcsec * RADIANS_PER_ARCSECOND;
  const poleY = poleYArcsec * RADIANS_PER_ARCSECOND;
  const x = (xi - poleX * zi) / 1000;
  const y = (yi + poleY * zi) / 1000;
  const z = (zi + poleX * xi - poleY * yi) / 1000;
  const pole = intermediatePole((tt.day - J2000_MJD + tt.fraction) / 36_525);
  const angle = earthRotationAngle(ut1) - pole.s;
  const cosine = Math.cos(angle);
  const sine = Math.sin(angle);
  const turned: Vector = [cosine * x - sine * y, sine * x + cosine * y, z];
  const velocity: Vector = [-ROTATION_RAD_PER_S * turned[1], ROTATION_RAD_PER_S * turned[0], 0];
  return { positionKm: toCelestial(pole, turned), velocityKmPerS: toCelestial(pole, velocity) };
}

/** From the intermediate equator to the GCRS (IERS Conventions 2010, eq. 5.10; s is already taken off the angle). */
function toCelestial(pole: IntermediatePole, [x, y, z]: Vector): Vector {
  const { x: px, y: py } = pole;
  const a = 1 / (1 + Math.sqrt(1 - px * px - py * py));
  return [
    (1 - a * px * px) * x - a * px * py * y + px * z,
    -a * px * py * x + (1 - a * py * py) * y + py * z,
    -px * x - py * y + (1 - a * (px * px + py * py)) * z,
  ];
}
