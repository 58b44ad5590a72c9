import { describe, expect, it } from 'vitest';
import type { ConfigProblem } from '../../../daemon/config/configuration.ts';
import { readPulsarFile } from '../../../daemon/config/pulsarFile.ts';
import { createSectionReader } from '../../../daemon/config/sectionReader.ts';
import { isFault, parseToml } from '../../../daemon/config/tomlDocument.ts';
import { PULSAR } from '../../support/configurationFolder.ts';

function read(text: string) {
  const problems: ConfigProblem[] = [];
  const document = parseToml(text);
  if (isFault(document)) throw new Error(document.message);
  const model = readPulsarFile(createSectionReader('pulsar.toml', document, problems));
  return { model, problems: problems.map(({ severity, message }) => `${severity} ${message}`) };
}

const KEPLERIAN = `[orbit]
form = "keplerian"
period_days = "0.322997448918"
period_derivative = "-2.4e-12"
projected_semi_major_axis_s = 2.341776
projected_semi_major_axis_derivative = "1e-14"
periastron_epoch_mjd = "52144.90097849"
eccentricity = "0.6171340"
eccentricity_derivative_per_s = "2e-17"
periastron_longitude_deg = 180
periastron_advance_deg_per_yr = "4.226585"
einstein_delay_s = "0.004307"
shapiro_range_s = "6.8e-6"
shapiro_shape = 0.73
`;

const SMALL = `[orbit]
form = "small eccentricity"
period_days = "1.533449474406"
projected_semi_major_axis_s = "1.897991"
ascending_node_epoch_mjd = "53113.950742009"
eccentricity_sine = "-5e-8"
eccentricity_cosine = "6e-8"
eccentricity_cosine_derivative_per_s = "1e-18"
`;

describe("the orbit of a pulsar's file", () => {
  it('is read in its Keplerian form', () => {
    const { model, problems } = read(PULSAR + KEPLERIAN);
    expect(problems).toEqual([]);
    expect(model?.orbit).toEqual({
      form: 'keplerian',
      periodDays: 0.322997448918,
      periodDerivative: -2.4e-12,
      projectedSemiMajorAxisS: 2.341776,
      projectedSemiMajorAxisDerivative: 1e-14,
      shapiroRangeS: 6.8e-6,
      shapiroShape: 0.73,
      periastronEpochTdb: { day: 52_144, fraction: 0.90097849 },
      eccentricity: 0.617134,
      eccentricityDerivativePerS: 2e-17,
      periastronLongitudeRad: Math.PI,
      // 4.226585° of a Julian year.
      periastronAdvanceRadPerS: expect.closeTo(2.3375613e-9, 16),
      einsteinDelayS: 0.004307,
    });
  });

  it('is read in its small-eccentricity form', () => {
    const { model, problems } = read(PULSAR + SMALL);
    expect(problems).toEqual([]);
    expect(model?.orbit).toEqual({
      form: 'small eccentricity',
      periodDays: 1.533449474406,
      periodDerivative: 0,
      projectedSemiMajorAxisS: 1.897991,
      projectedSemiMajorAxisDerivative: 0,
      shapiroRangeS: 0,
      shapiroShape: 0,
      ascendingNodeEpochTdb: { day: 53_113, fraction: 0.950742009 },
      eccentricitySine: -5e-8,
      eccentricitySineDerivativePerS: 0,
      eccentricityCosine: 6e-8,
      eccentricityCosineDerivativePerS: 1e-18,
    });
  });

  it.each([
    [KEPLERIAN, 'form = "keplerian"', 'form = "circular"', 'orbit, form: must be one of "keplerian", "small ecc'],
    [KEPLERIAN, 'form = "keplerian"\n', '', 'orbit, form: must be one of'],
    [KEPLERIAN, 'period_days = "0.322997448918"\n', '', 'orbit, period_days: must be a number'],
    [KEPLERIAN, 'period_days', 'period_day', 'orbit, period_day: unknown key; did you mean "period_days"?'],
    [
      KEPLERIAN,
      'eccentricity = "0.6171340"',
      'eccentricity = 1',
      'orbit, eccentricity: must be a number between 0 and 0.99',
    ],
    [KEPLERIAN, '"52144.90097849"', '"2452144"', 'orbit, periastron_epoch_mjd: must be a Modified Julian Date'],
    [KEPLERIAN, '"2e-17"', '"1e-9"', 'orbit, eccentricity_derivative_per_s: takes the eccentricity out of 0 to 0.99'],
    [KEPLERIAN, 'shapiro_shape = 0.73', '', 'orbit: shapiro_range_s and shapiro_shape go together'],
    [KEPLERIAN, '= 2.341776', '= 2341.776', 'would make the pulsar 1.1 times as fast as light: check the units'],
    [KEPLERIAN, 'einstein_delay_s', 'ascending_node_epoch_mjd', 'orbit, ascending_node_epoch_mjd: unknown key'],
    [SMALL, '"-5e-8"', '"-0.5"', 'orbit, eccentricity_sine: must be a number between -0.1 and 0.1'],
  ])('is refused when wrong', (orbit, from, to, message) => {
    expect(orbit).toContain(from);
    const { model, problems } = read(PULSAR + orbit.replace(from, to));
    expect(model).toBeNull();
    expect(problems.join('\n')).toContain(message);
  });

  it('is taken with a warning when the small-eccentricity form is too coarse for it', () => {
    const { model, problems } = read(PULSAR + SMALL.replace('"-5e-8"', '"-5e-3"'));
    expect(model?.orbit?.form).toBe('small eccentricity');
    expect(problems).toEqual([
      'warning orbit, form: leaves out terms of some 0.24 µs at the eccentricity 0.0050: use "keplerian"',
    ]);
  });
});

describe('a position in ecliptic coordinates', () => {
  const inEcliptic = (lines: string) =>
    read(PULSAR.replace(/(declination|proper_motion).*\n/g, '').replace(/right_ascension.*\n/, lines));

  it('becomes the equatorial one: the pole of the ecliptic stands at 18 h, 90° − ε, ε = 84381.406″ (IERS Conventions 2010)', () => {
    const { model, problems } = inEcliptic('ecliptic_longitude = 0\necliptic_latitude = "+90:00:00"\n');
    expect(problems).toEqual([]);
    expect(model?.rightAscensionRad).toBeCloseTo(1.5 * Math.PI, 12);
    expect(model?.declinationRad).toBeCloseTo(Math.PI / 2 - (84_381.406 / 3600) * (Math.PI / 180), 14);
  });

  it('on the ecliptic: tan α = cos ε tan λ, sin δ = sin ε sin λ (textbook), with the obliquity of its own model', () => {
    const { model } = inEcliptic(
      'ecliptic_longitude = "230:30:00"\necliptic_latitude = 0\necliptic_obliquity_arcsec = 84381.448\n',
    );
    const obliquity = (84_381.448 / 3600) * (Math.PI / 180);
    const longitude = (230.5 * Math.PI) / 180;
    expect(Math.tan(model!.rightAscensionRad)).toBeCloseTo(Math.cos(obliquity) * Math.tan(longitude), 13);
    expect(model!.rightAscensionRad).toBeGreaterThan(Math.PI);
    expect(Math.sin(model!.declinationRad)).toBeCloseTo(Math.sin(obliquity) * Math.sin(longitude), 14);
  });

  it('moves as it did: its motion taken as a small step on the sphere', () => {
    const at = (longitude: number, latitude: number) =>
      inEcliptic(
        `ecliptic_longitude = ${longitude}\necliptic_latitude = ${latitude}\necliptic_proper_motion_mas_per_yr = [30, -50]\n`,
      ).model!;
    const perYr = 1 / 3_600_000;
    const here = at(70, 25);
    const years = 1000;
    const there = at(70 + (years * 30 * perYr) / Math.cos((25 * Math.PI) / 180), 25 - years * 50 * perYr);
    const masPerRad = (180 / Math.PI) * 3_600_000;
    const east = (there.rightAscensionRad - here.rightAscensionRad) * Math.cos(here.declinationRad) * masPerRad;
    const north = (there.declinationRad - here.declinationRad) * masPerRad;
    expect(east / years).toBeCloseTo(here.properMotionMasPerYr[0], 1);
    expect(north / years).toBeCloseTo(here.properMotionMasPerYr[1], 1);
    expect(Math.hypot(...here.properMotionMasPerYr)).toBeCloseTo(Math.hypot(30, 50), 10);
  });

  it.each([
    [
      'ecliptic_longitude = 360\necliptic_latitude = 0\n',
      'ecliptic_longitude: must be "ddd:mm:ss.s" or degrees from 0 to 360',
    ],
    ['ecliptic_longitude = 10\n', 'ecliptic_latitude: is missing'],
    ['ecliptic_obliquity_arcsec = 23.4\n', 'ecliptic_obliquity_arcsec: must be between 84300 and 84460 arc seconds'],
  ])('is refused when wrong', (lines, message) => {
    const { model, problems } = inEcliptic(lines);
    expect(model).toBeNull();
    expect(problems.join('\n')).toContain(message);
  });
});
