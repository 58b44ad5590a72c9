import { z } from 'zod';
import { digits, oneOf } from './fields.ts';

/** The [orbit] of a pulsar's file: what both forms have, and what each has of its own. */

export const orbitForm = z.looseObject({ form: oneOf(['keplerian', 'small eccentricity']) });

const size = {
  form: z.string(),
  period_days: digits,
  period_derivative: digits.optional(),
  projected_semi_major_axis_s: digits,
  projected_semi_major_axis_derivative: digits.optional(),
  shapiro_range_s: digits.optional(),
  shapiro_shape: digits.optional(),
};

export const keplerianTable = z.strictObject({
  ...size,
  periastron_epoch_mjd: digits,
  eccentricity: digits,
  eccentricity_derivative_per_s: digits.optional(),
  periastron_longitude_deg: digits,
  periastron_advance_deg_per_yr: digits.optional(),
  einstein_delay_s: digits.optional(),
});

export const smallEccentricityTable = z.strictObject({
  ...size,
  ascending_node_epoch_mjd: digits,
  eccentricity_sine: digits,
  eccentricity_sine_derivative_per_s: digits.optional(),
  eccentricity_cosine: digits,
  eccentricity_cosine_derivative_per_s: digits.optional(),
});
