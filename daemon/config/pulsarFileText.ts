import { DAYS_PER_JULIAN_YEAR } from '../../detectors/sky/constants.ts';
import { formatDoubleDouble } from '../../detectors/spin/doubleDouble.ts';
import type { KnownGlitch, Orbit, PulsarModel, SpinDown } from '../../detectors/spin/pulsarModel.ts';
import { formatMjd, type Mjd, SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';

/**
 * A pulsar's model as a file of the models folder, with all its digits: what `readPulsarFile` reads, the other way round. Always in
 * TDB; a position that was given in ecliptic coordinates is written in ICRS.
 *
 * @param remarks lines of comment at its head
 */
export function pulsarFileText(model: PulsarModel, remarks: readonly string[]): string {
  const lines = [
    ...remarks.map((line) => `# ${line}`),
    ...headLines(model),
    ...spinLines(model.spin, model.ephemeris),
    ...model.glitches.flatMap(glitchLines),
    ...(model.orbit === undefined ? [] : orbitLines(model.orbit)),
    ...receiverLines(model),
    ...settingLines(model),
  ];
  return `${lines.join('\n')}\n`;
}

const DEGREE = Math.PI / 180;

function headLines(model: PulsarModel): string[] {
  const { dispersionMeasureSlope: slope, solarWindPerCm3 } = model;
  return [
    `name = ${text(model.name)}`,
    `right_ascension = "${plain(model.rightAscensionRad / DEGREE)}"`,
    `declination = "${plain(model.declinationRad / DEGREE)}"`,
    `position_epoch_mjd = ${model.positionEpochMjd}`,
    `proper_motion_mas_per_yr = [${model.properMotionMasPerYr.join(', ')}]`,
    `parallax_mas = ${model.parallaxMas}`,
    `dispersion_measure = ${model.dispersionMeasure}`,
    ...(slope === undefined
      ? []
      : [`dispersion_measure_derivative_per_yr = ${slope.perYr}`, `dispersion_measure_epoch_mjd = ${slope.epochMjd}`]),
    ...(solarWindPerCm3 === undefined ? [] : [`solar_wind_density_per_cm3 = ${solarWindPerCm3}`]),
  ];
}

function spinLines(spin: SpinDown, ephemeris: string | undefined): string[] {
  const higher = spin.higherFrequencyDerivatives ?? [];
  return [
    '',
    '[spin]',
    'time_scale = "TDB"',
    ...(ephemeris === undefined ? [] : [`ephemeris = ${text(ephemeris)}`]),
    `epoch_mjd = "${dateText(spin.epochTdb)}"`,
    `frequency_hz = "${formatDoubleDouble(spin.frequencyHz)}"`,
    `frequency_derivative = "${spin.frequencyDerivativeHzPerS}"`,
    `frequency_second_derivative = "${spin.frequencySecondDerivativeHzPerS2}"`,
    ...(higher.length === 0 ? [] : [`frequency_higher_derivatives = [${higher.map((x) => `"${x}"`).join(', ')}]`]),
    ...(spin.phaseAtEpochTurns === undefined ? [] : [`phase_at_epoch_turns = "${spin.phaseAtEpochTurns}"`]),
  ];
}

function glitchLines(glitch: KnownGlitch): string[] {
  return [
    '',
    '[[glitch]]',
    `epoch_mjd = "${dateText(glitch.epochTdb)}"`,
    `phase_turns = "${glitch.phaseTurns}"`,
    `frequency_step_hz = "${glitch.frequencyStepHz}"`,
    `frequency_derivative_step = "${glitch.frequencyDerivativeStepHzPerS}"`,
    ...glitch.recoveries.flatMap(({ frequencyStepHz, timescaleDays }) => [
      '[[glitch.recovery]]',
      `frequency_step_hz = "${frequencyStepHz}"`,
      `timescale_days = "${timescaleDays}"`,
    ]),
  ];
}

function orbitLines(orbit: Orbit): string[] {
  const perYear = (DAYS_PER_JULIAN_YEAR * SECONDS_PER_DAY) / DEGREE;
  const shapiro = orbit.shapiroRangeS !== 0 || orbit.shapiroShape !== 0;
  const own =
    orbit.form === 'keplerian'
      ? {
          periastron_epoch_mjd: dateText(orbit.periastronEpochTdb),
          eccentricity: orbit.eccentricity,
          eccentricity_derivative_per_s: orbit.eccentricityDerivativePerS,
          periastron_longitude_deg: orbit.periastronLongitudeRad / DEGREE,
          periastron_advance_deg_per_yr: orbit.periastronAdvanceRadPerS * perYear,
          einstein_delay_s: orbit.einsteinDelayS,
        }
      : {
          ascending_node_epoch_mjd: dateText(orbit.ascendingNodeEpochTdb),
          eccentricity_sine: orbit.eccentricitySine,
          eccentricity_sine_derivative_per_s: orbit.eccentricitySineDerivativePerS,
          eccentricity_cosine: orbit.eccentricityCosine,
          eccentricity_cosine_derivative_per_s: orbit.eccentricityCosineDerivativePerS,
        };
  const numbers = {
    period_days: orbit.periodDays,
    period_derivative: orbit.periodDerivative,
    projected_semi_major_axis_s: orbit.projectedSemiMajorAxisS,
    projected_semi_major_axis_derivative: orbit.projectedSemiMajorAxisDerivative,
    ...(shapiro ? { shapiro_range_s: orbit.shapiroRangeS, shapiro_shape: orbit.shapiroShape } : {}),
    ...own,
  };
  const lines = Object.entries(numbers).map(([key, value]) => `${key} = "${value}"`);
  return ['', '[orbit]', `form = "${orbit.form}"`, ...lines];
}

function receiverLines({ receivers = [] }: PulsarModel): string[] {
  return receivers.flatMap(({ receiver, site, offsetUs, uncertaintyUs }) => [
    '',
    '[[receiver]]',
    `name = ${text(receiver)}`,
    ...(site === undefined ? [] : [`site = ${text(site)}`]),
    `offset_us = ${offsetUs}`,
    `uncertainty_us = ${uncertaintyUs}`,
  ]);
}

/** What the operator fixed of the noise and of the alerts goes on standing. */
function settingLines({ noise, alerts }: PulsarModel): string[] {
  const fixed = [
    ...(noise.uncertaintyScale === undefined ? [] : [`uncertainty_scale = ${noise.uncertaintyScale}`]),
    ...(noise.floorUs === undefined ? [] : [`floor_us = ${noise.floorUs}`]),
  ];
  const own = [
    ...(alerts.extraRecipients.length === 0
      ? []
      : [`extra_recipients = [${alerts.extraRecipients.map(text).join(', ')}]`]),
    ...(alerts.confirmLogOdds === undefined ? [] : [`confirm_log_odds = ${alerts.confirmLogOdds}`]),
  ];
  return [
    ...(fixed.length === 0 ? [] : ['', '[noise]', ...fixed]),
    ...(own.length === 0 ? [] : ['', '[alerts]', ...own]),
  ];
}

/** TOML's basic strings escape as JSON does; names hold no control characters. */
function text(value: string): string {
  return JSON.stringify(value);
}

/** Angles are read without an exponent. */
function plain(value: number): string {
  return formatDoubleDouble({ hi: value, lo: 0 });
}

function dateText(date: Mjd): string {
  return date.fraction === 0 ? String(date.day) : formatMjd(date);
}
