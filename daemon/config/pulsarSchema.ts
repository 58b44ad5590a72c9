import { z } from 'zod';
import { digits, mailAddress, name, numberBetween, oneOf, path } from './fields.ts';

/** The tables of a pulsar's file, one schema each: nested tables are read on their own (`SectionReader`). */

const nested = z.unknown().optional();

const motion = (components: string) =>
  z
    .tuple([z.number(), z.number()], { error: `must be two numbers: ${components} in mas per year` })
    .refine(([along, north]) => Math.hypot(along, north) <= 5000, 'is faster than any star: mas per year are wanted')
    .optional();

export const pulsarTable = z.strictObject({
  name,
  right_ascension: digits.optional(),
  declination: digits.optional(),
  position_epoch_mjd: numberBetween(30_000, 100_000, '(a Modified Julian Date)').optional(),
  proper_motion_mas_per_yr: motion('[α cos δ, δ]'),
  ecliptic_longitude: digits.optional(),
  ecliptic_latitude: digits.optional(),
  ecliptic_proper_motion_mas_per_yr: motion('[λ cos β, β]'),
  ecliptic_obliquity_arcsec: numberBetween(84_300, 84_460, 'arc seconds').optional(),
  parallax_mas: numberBetween(-50, 1000, 'mas').default(0),
  dispersion_measure: numberBetween(0, 10_000, 'pc cm⁻³'),
  dispersion_measure_derivative_per_yr: numberBetween(-10, 10, 'pc cm⁻³ a year').optional(),
  dispersion_measure_epoch_mjd: numberBetween(30_000, 100_000, '(a Modified Julian Date)').optional(),
  solar_wind_density_per_cm3: numberBetween(0, 100, 'electrons per cm³ at 1 au').optional(),
  spin: nested,
  glitch: nested,
  orbit: nested,
  receiver: nested,
  noise: nested,
  alerts: nested,
});

export const spinTable = z.strictObject({
  time_scale: oneOf(['TDB', 'TCB']),
  ephemeris: path.optional(),
  epoch_mjd: digits,
  frequency_hz: digits,
  frequency_derivative: digits,
  frequency_second_derivative: digits.default('0'),
  frequency_higher_derivatives: z.array(digits).max(9, 'must not hold more than 9').default([]),
  phase_at_epoch_turns: digits.optional(),
});

export const glitchTable = z.strictObject({
  epoch_mjd: digits,
  phase_turns: digits.default(0),
  frequency_step_hz: digits.default(0),
  frequency_derivative_step: digits.default(0),
  recovery: nested,
});

export const recoveryTable = z.strictObject({
  frequency_step_hz: digits,
  timescale_days: digits,
});

/** An offset of ten seconds is a fault of the clock, not of a receiver. */
export const receiverTable = z.strictObject({
  name,
  site: name.optional(),
  offset_us: numberBetween(-1e7, 1e7, 'µs'),
  uncertainty_us: numberBetween(0, 1e7, 'µs').default(1),
});

export const noiseTable = z.strictObject({
  uncertainty_scale: numberBetween(0.05, 1000, '').optional(),
  floor_us: numberBetween(0, 1e7, 'µs').optional(),
});

export const alertsTable = z.strictObject({
  extra_recipients: z.array(mailAddress).default([]),
  confirm_log_odds: numberBetween(0, 1000, '(natural logarithm)').optional(),
});
