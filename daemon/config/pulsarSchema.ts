import { z } from 'zod';
import { digits, mailAddress, name, numberBetween, oneOf } from './fields.ts';

/** The tables of a pulsar's file, one schema each: nested tables are read on their own (`SectionReader`). */

const nested = z.unknown().optional();

export const pulsarTable = z.strictObject({
  name,
  right_ascension: digits,
  declination: digits,
  position_epoch_mjd: numberBetween(30_000, 100_000, '(a Modified Julian Date)').optional(),
  proper_motion_mas_per_yr: z
    .tuple([z.number(), z.number()], { error: 'must be two numbers: [α cos δ, δ] in mas per year' })
    .refine(([alpha, delta]) => Math.hypot(alpha, delta) <= 5000, 'is faster than any star: mas per year are wanted')
    .default([0, 0]),
  parallax_mas: numberBetween(-50, 1000, 'mas').default(0),
  dispersion_measure: numberBetween(0, 10_000, 'pc cm⁻³'),
  spin: nested,
  glitch: nested,
  orbit: nested,
  noise: nested,
  alerts: nested,
});

export const spinTable = z.strictObject({
  time_scale: oneOf(['TDB', 'TCB']),
  ephemeris: z.string().default('built-in'),
  epoch_mjd: digits,
  frequency_hz: digits,
  frequency_derivative: digits,
  frequency_second_derivative: digits.default('0'),
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

export const noiseTable = z.strictObject({
  uncertainty_scale: numberBetween(0.05, 1000, '').optional(),
  floor_us: numberBetween(0, 1e7, 'µs').optional(),
});

export const alertsTable = z.strictObject({
  extra_recipients: z.array(mailAddress).default([]),
  confirm_log_odds: numberBetween(0, 1000, '(natural logarithm)').optional(),
});
