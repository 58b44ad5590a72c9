import { DAYS_PER_JULIAN_YEAR } from '../../detectors/sky/constants.ts';
import { LARGEST_ECCENTRICITY } from '../../detectors/sky/keplerianOrbit.ts';
import type { KeplerianOrbit, Orbit, OrbitSize, SmallEccentricityOrbit } from '../../detectors/spin/orbitModel.ts';
import { SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';
import { type Bounds, date, numberWithin } from './modelNumbers.ts';
import { keplerianTable, orbitForm, smallEccentricityTable } from './orbitSchema.ts';
import type { SectionReader } from './sectionReader.ts';

const RADIANS_PER_DEGREE = Math.PI / 180;
const SECONDS_PER_YEAR = DAYS_PER_JULIAN_YEAR * SECONDS_PER_DAY;

/** Finding the emission time asks for a pulsar much slower than light; the fastest known reach a hundredth (common practice, no source). */
const FASTEST_OF_LIGHT = 0.1;
const LARGEST_SMALL_ECCENTRICITY = 0.1;
/** How long from its epoch a drifting eccentricity has to stay one. */
const DRIFT_YEARS = 50;

/** The [orbit] of a pulsar's file; null after complaints. */
export function readOrbit(reader: SectionReader): Orbit | null {
  const table = reader.read(['orbit'], orbitForm);
  if (table === null) return null;
  return table.form === 'keplerian' ? readKeplerian(reader) : readSmallEccentricity(reader);
}

function readKeplerian(reader: SectionReader): KeplerianOrbit | null {
  const table = reader.read(['orbit'], keplerianTable);
  const size = readSize(reader);
  const periastronEpochTdb = date(reader, ['orbit', 'periastron_epoch_mjd']);
  const eccentricity = number(reader, 'eccentricity', { low: 0, high: LARGEST_ECCENTRICITY, unit: '' });
  const drift = number(reader, 'eccentricity_derivative_per_s', { low: -1e-9, high: 1e-9, unit: '/s', absent: 0 });
  const longitude = number(reader, 'periastron_longitude_deg', { low: -360, high: 360, unit: 'degrees' });
  const advance = number(reader, 'periastron_advance_deg_per_yr', { ...signed(1000, 'degrees a year'), absent: 0 });
  const einsteinDelayS = number(reader, 'einstein_delay_s', { ...signed(1, 's'), absent: 0 });
  if (table === null || size === null || periastronEpochTdb === null) return null;
  if (eccentricity === null || drift === null || longitude === null || advance === null || einsteinDelayS === null) {
    return null;
  }
  const drifted = Math.abs(drift) * DRIFT_YEARS * SECONDS_PER_YEAR;
  if (drift !== 0 && (eccentricity < drifted || eccentricity + drifted > LARGEST_ECCENTRICITY)) {
    const message = `takes the eccentricity out of 0 to ${LARGEST_ECCENTRICITY} within ${DRIFT_YEARS} years: is it per second?`;
    reader.error(['orbit', 'eccentricity_derivative_per_s'], message);
    return null;
  }
  if (tooFast(reader, size, eccentricity)) return null;
  return {
    form: 'keplerian',
    ...size,
    periastronEpochTdb,
    eccentricity,
    eccentricityDerivativePerS: drift,
    periastronLongitudeRad: longitude * RADIANS_PER_DEGREE,
    periastronAdvanceRadPerS: (advance * RADIANS_PER_DEGREE) / SECONDS_PER_YEAR,
    einsteinDelayS,
  };
}

function readSmallEccentricity(reader: SectionReader): SmallEccentricityOrbit | null {
  const table = reader.read(['orbit'], smallEccentricityTable);
  const size = readSize(reader);
  const ascendingNodeEpochTdb = date(reader, ['orbit', 'ascending_node_epoch_mjd']);
  const part = signed(LARGEST_SMALL_ECCENTRICITY, '');
  const drift = { ...signed(1e-10, '/s'), absent: 0 };
  const eccentricitySine = number(reader, 'eccentricity_sine', part);
  const eccentricityCosine = number(reader, 'eccentricity_cosine', part);
  const sineDrift = number(reader, 'eccentricity_sine_derivative_per_s', drift);
  const cosineDrift = number(reader, 'eccentricity_cosine_derivative_per_s', drift);
  if (table === null || size === null || ascendingNodeEpochTdb === null) return null;
  if (eccentricitySine === null || eccentricityCosine === null || sineDrift === null || cosineDrift === null)
    return null;
  const eccentricity = Math.hypot(eccentricitySine, eccentricityCosine);
  const leftOutS = size.projectedSemiMajorAxisS * eccentricity ** 3;
  if (leftOutS > 1e-8) {
    const size = leftOutS < 1e-3 ? `${(leftOutS * 1e6).toPrecision(2)} µs` : `${leftOutS.toPrecision(2)} s`;
    const message = `leaves out terms of some ${size} at the eccentricity ${eccentricity.toPrecision(2)}: use "keplerian"`;
    reader.warning(['orbit', 'form'], message);
  }
  if (tooFast(reader, size, eccentricity)) return null;
  return {
    form: 'small eccentricity',
    ...size,
    ascendingNodeEpochTdb,
    eccentricitySine,
    eccentricitySineDerivativePerS: sineDrift,
    eccentricityCosine,
    eccentricityCosineDerivativePerS: cosineDrift,
  };
}

function readSize(reader: SectionReader): OrbitSize | null {
  const periodDays = number(reader, 'period_days', { low: 0.001, high: 1e6, unit: 'days' });
  const periodDerivative = number(reader, 'period_derivative', { ...signed(1e-6, 's/s'), absent: 0 });
  const axisS = number(reader, 'projected_semi_major_axis_s', { low: 0, high: 1e5, unit: 'light-seconds' });
  const axisDerivative = number(reader, 'projected_semi_major_axis_derivative', { ...signed(1e-8, ''), absent: 0 });
  const shapiroRangeS = number(reader, 'shapiro_range_s', { low: 0, high: 1e-3, unit: 's', absent: 0 });
  const shapiroShape = number(reader, 'shapiro_shape', { low: 0, high: 1, unit: '', absent: 0 });
  if (periodDays === null || periodDerivative === null || axisS === null) return null;
  if (axisDerivative === null || shapiroRangeS === null || shapiroShape === null) return null;
  if (reader.has(['orbit', 'shapiro_range_s']) !== reader.has(['orbit', 'shapiro_shape'])) {
    reader.error(['orbit'], 'shapiro_range_s and shapiro_shape go together: one of them is missing');
    return null;
  }
  return {
    periodDays,
    periodDerivative,
    projectedSemiMajorAxisS: axisS,
    projectedSemiMajorAxisDerivative: axisDerivative,
    shapiroRangeS,
    shapiroShape,
  };
}

function tooFast(reader: SectionReader, size: OrbitSize, eccentricity: number): boolean {
  const mean = (2 * Math.PI * size.projectedSemiMajorAxisS) / (size.periodDays * SECONDS_PER_DAY);
  const atPeriastron = mean * Math.sqrt((1 + eccentricity) / (1 - eccentricity));
  if (atPeriastron <= FASTEST_OF_LIGHT) return false;
  const message = `with period_days would make the pulsar ${atPeriastron.toPrecision(2)} times as fast as light: check the units (light-seconds, days)`;
  reader.error(['orbit', 'projected_semi_major_axis_s'], message);
  return true;
}

function number(reader: SectionReader, key: string, bounds: Bounds): number | null {
  return numberWithin(reader, ['orbit', key], bounds);
}

function signed(size: number, unit: string): Bounds {
  return { low: -size, high: size, unit };
}
