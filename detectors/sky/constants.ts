/** Speed of light, km/s: SI, exact. */
export const LIGHT_KM_PER_S = 299_792.458;

/** Astronomical unit, km: IAU 2012 resolution B2, exact. */
export const AU_KM = 149_597_870.7;

export const PARSEC_KM = (AU_KM * 648_000) / Math.PI;

/** GM☉/c³, s: GM☉ = 1.32712440041e20 m³/s² (IAU 2009 system of constants, TDB-compatible). */
export const SUN_MASS_S = 1.32712440041e20 / 299_792_458 ** 3;

/** s MHz² pc⁻¹ cm³: the rounded value 1/2.41e-4 in which dispersion measures are quoted (Kulkarni 2020, arXiv:2007.02886). */
export const DISPERSION_CONSTANT = 1 / 2.41e-4;

export const RADIANS_PER_ARCSECOND = Math.PI / 648_000;

export const RADIANS_PER_MAS = RADIANS_PER_ARCSECOND / 1000;

/** J2000.0 as a Modified Julian Date. */
export const J2000_MJD = 51_544.5;

export const DAYS_PER_JULIAN_YEAR = 365.25;
