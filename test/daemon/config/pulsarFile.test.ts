import { resolve } from 'node:path';
import { describe, expect, it } from 'vitest';
import type { ConfigProblem } from '../../../daemon/config/configuration.ts';
import { readPulsarFile } from '../../../daemon/config/pulsarFile.ts';
import { createSectionReader } from '../../../daemon/config/sectionReader.ts';
import { isFault, parseToml } from '../../../daemon/config/tomlDocument.ts';
import { parseDoubleDouble } from '../../../detectors/spin/doubleDouble.ts';
import { PULSAR } from '../../support/configurationFolder.ts';

function read(text: string) {
  const problems: ConfigProblem[] = [];
  const document = parseToml(text);
  if (isFault(document)) throw new Error(document.message);
  const model = readPulsarFile(createSectionReader('pulsar.toml', document, problems));
  return { model, problems: problems.map(({ line, severity, message }) => `${line} ${severity} ${message}`) };
}

const changed = (from: string, to: string) => {
  expect(PULSAR).toContain(from);
  return read(PULSAR.replace(from, to));
};

describe("a pulsar's file", () => {
  it('becomes a model with every digit', () => {
    const { model, problems } = read(PULSAR);
    expect(problems).toEqual([]);
    expect(model).toEqual({
      name: 'KR 0417+31',
      // By hand: 15 (4 + 17/60 + 32.114/3600)° and 31 + 5/60 + 9.8/3600°.
      rightAscensionRad: expect.closeTo((64.38380833333333 * Math.PI) / 180, 14),
      declinationRad: expect.closeTo((31.08605555555556 * Math.PI) / 180, 14),
      positionEpochMjd: 59000,
      properMotionMasPerYr: [3.1, -7.4],
      parallaxMas: 0.8,
      dispersionMeasure: 41.27,
      ephemeris: 'built-in',
      spin: {
        epochTdb: { day: 59000, fraction: 0 },
        frequencyHz: parseDoubleDouble('6.3417701123349'),
        frequencyDerivativeHzPerS: -4.113e-13,
        frequencySecondDerivativeHzPerS2: 0,
      },
      glitches: [],
      noise: {},
      alerts: { extraRecipients: [] },
    });
  });

  it('keeps digits that a double does not hold, in quotes or as a number', () => {
    const digits = '205.53069900312399565123';
    for (const written of [`"${digits}"`, digits, '205.530_699_003_123_995_651_23']) {
      expect(changed('"6.3417701123349"', written).model?.spin.frequencyHz).toEqual(parseDoubleDouble(digits));
    }
    expect(parseDoubleDouble(digits).lo).not.toBe(0);
    expect(changed('"59000.000000"', '59000.12345678901234567').model?.spin.epochTdb).toEqual({
      day: 59000,
      fraction: Number('0.12345678901234567'),
    });
  });

  it('names its ephemeris: the built-in one, a kernel beside it, or none', () => {
    expect(changed('"built-in"', '"kernels/planets.bsp"').model?.ephemeris).toBe(resolve('kernels/planets.bsp'));
    expect(changed('ephemeris = "built-in"\n', '').model).not.toHaveProperty('ephemeris');
  });

  it.each([
    ['"04:17:32.114"', '64.5', 64.5],
    ['"04:17:32.114"', '"64.5"', 64.5],
    ['"04:17:32.114"', '"00:00:00"', 0],
  ])('takes the right ascension %s → %s', (from, to, degrees) => {
    expect(changed(from, to).model?.rightAscensionRad).toBeCloseTo((degrees * Math.PI) / 180, 15);
  });

  it.each([
    ['"-00:30:00"', -0.5],
    ['"+90:00:00"', 90],
    ['-89.75', -89.75],
    ['"31:05:09.80"', 31.08605555555556],
  ])('takes the declination %s', (to, degrees) => {
    expect(changed('"+31:05:09.80"', to).model?.declinationRad).toBeCloseTo((degrees * Math.PI) / 180, 14);
  });

  it.each([
    ['"04:17:32.114"', '"04:60:00"', 'right_ascension'],
    ['"04:17:32.114"', '-3', 'right_ascension'],
    ['"04:17:32.114"', '"4h17m"', 'right_ascension'],
    ['"+31:05:09.80"', '"+90:00:01"', 'declination'],
    ['dispersion_measure = 41.27', 'dispersion_measure = "41"', 'dispersion_measure: must be a number, found a text'],
    [
      '"59000.000000"',
      '"2459000.5"',
      'spin, epoch_mjd: must be a Modified Julian Date between 30000 and 100000, found "2459000.5"',
    ],
    [
      '"6.3417701123349"',
      '"0"',
      'spin, frequency_hz: must be between 0.0001 and 2000 Hz (the frequency, not the period), found "0"',
    ],
    ['"6.3417701123349"', '"6,34"', 'spin, frequency_hz'],
    [
      '"-4.113e-13"',
      '"-4.113"',
      'spin, frequency_derivative: must be a number between -1e-7 and 1e-7 Hz/s, found "-4.113"',
    ],
    ['"built-in"', '""', 'spin, ephemeris: must not be empty'],
    ['time_scale = "TDB"', 'time_scale = "TT"', 'spin, time_scale: must be one of "TDB", "TCB", found "TT"'],
    [
      'position_epoch_mjd = 59000\n',
      '',
      'position_epoch_mjd: is missing, and the position moves: say at which date it holds',
    ],
    ['frequency_derivative =', 'frequency_dot =', 'spin, frequency_dot: unknown key; did you mean "frequency_hz"?'],
    ['[spin]', '[noise]\nuncertainty_scale = 0\n[spin]', 'noise, uncertainty_scale'],
    ['[spin]', '[alerts]\nextra_recipients = ["x"]\n[spin]', 'alerts, extra_recipients 1'],
    ['[spin]', '[[glitch]]\nepoch = "59100"\n[spin]', 'glitch 1, epoch: unknown key; did you mean "epoch_mjd"?'],
    [
      '[spin]',
      '[[glitch]]\nepoch_mjd = 59100\n[[glitch.recovery]]\nfrequency_step_hz = 1e-8\ntimescale_days = 0\n[spin]',
      'glitch 1, recovery 1, timescale_days: must be larger than 0 d',
    ],
    [
      '[spin]',
      `[[glitch]]\nepoch_mjd = 59100\n${'[[glitch.recovery]]\nfrequency_step_hz = 1e-8\ntimescale_days = 9\n'.repeat(4)}[spin]`,
      'glitch 1, recovery 4: is one too many: at most 3 exponentials are taken',
    ],
    [
      '[spin]',
      'dispersion_measure_derivative_per_yr = 0.1\n[spin]',
      'dispersion_measure_epoch_mjd: is missing, and the dispersion measure changes: say at which date it holds',
    ],
    [
      '[spin]',
      '[spin]\nfrequency_higher_derivatives = [1e-30, 1]',
      'spin, frequency_higher_derivatives 2: must be a number between -1e-20 and 1e-20 Hz/s^4, found "1"',
    ],
    ['right_ascension =', '# right_ascension =', 'right_ascension: is missing'],
    [
      '[spin]',
      'ecliptic_longitude = 10\n[spin]',
      'ecliptic_longitude: stands beside right_ascension: give the position in one kind of coordinates',
    ],
  ])('refuses %s → %s', (from, to, message) => {
    const { model, problems } = changed(from, to);
    expect(model).toBeNull();
    expect(problems.some((problem) => problem.includes(message) && problem.includes('error'))).toBe(true);
  });

  it('reads known glitches with their recoveries, oldest first, and the settings', () => {
    const { model, problems } = read(`${PULSAR}
[[glitch]]
epoch_mjd = "59200.5"
frequency_step_hz = "1.5e-7"
[[glitch]]
epoch_mjd = 59100
phase_turns = 0.01
frequency_step_hz = 2e-8
frequency_derivative_step = "-1e-15"
[[glitch.recovery]]
frequency_step_hz = 3e-9
timescale_days = 20
[noise]
uncertainty_scale = 1.3
floor_us = 40
[alerts]
extra_recipients = ["timing@kestrel.example"]
confirm_log_odds = 12
`);
    expect(problems).toEqual([]);
    expect(model?.glitches).toEqual([
      {
        epochTdb: { day: 59100, fraction: 0 },
        phaseTurns: 0.01,
        frequencyStepHz: 2e-8,
        frequencyDerivativeStepHzPerS: -1e-15,
        recoveries: [{ frequencyStepHz: 3e-9, timescaleDays: 20 }],
      },
      {
        epochTdb: { day: 59200, fraction: 0.5 },
        phaseTurns: 0,
        frequencyStepHz: 1.5e-7,
        frequencyDerivativeStepHzPerS: 0,
        recoveries: [],
      },
    ]);
    expect(model?.noise).toEqual({ uncertaintyScale: 1.3, floorUs: 40 });
    expect(model?.alerts).toEqual({ extraRecipients: ['timing@kestrel.example'], confirmLogOdds: 12 });
  });

  it('takes derivatives beyond the second, a phase at the epoch, a changing dispersion measure and the solar wind', () => {
    const { model, problems } = changed(
      '[spin]',
      `dispersion_measure_derivative_per_yr = -0.003
dispersion_measure_epoch_mjd = 58000
solar_wind_density_per_cm3 = 7.9
[spin]
frequency_higher_derivatives = ["-5.1e-31", 3e-40]
phase_at_epoch_turns = "0.25"`,
    );
    expect(problems).toEqual([]);
    expect(model?.dispersionMeasureSlope).toEqual({ perYr: -0.003, epochMjd: 58_000 });
    expect(model?.solarWindPerCm3).toBe(7.9);
    expect(model?.spin).toMatchObject({ higherFrequencyDerivatives: [-5.1e-31, 3e-40], phaseAtEpochTurns: 0.25 });
  });

  it('warns of a pulsar that spins up', () => {
    const { model, problems } = changed('"-4.113e-13"', '"4.113e-13"');
    expect(model).not.toBeNull();
    expect(problems).toEqual([
      '13 warning spin, frequency_derivative: is positive: the pulsar would spin up, as accreting ones do. Or is this the derivative of the period?',
    ]);
  });

  it('turns TCB into TDB and says so', () => {
    const { model, problems } = changed('"TDB"', '"TCB"');
    expect(problems).toEqual([
      '9 warning spin, time_scale: the model was turned from TCB into TDB (IAU 2006 resolution B3)',
    ]);
    expect(model?.spin.frequencyHz.hi).toBeGreaterThan(6.3417701123349);
  });
});
