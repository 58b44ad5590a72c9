import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterAll, describe, expect, test } from 'vitest';
import type { ConfigProblem } from '../../../daemon/config/configuration.ts';
import { loadModels } from '../../../daemon/config/models.ts';
import { pulsarFileText } from '../../../daemon/config/pulsarFileText.ts';
import { createKernelShelf } from '../../../daemon/tables/kernelFile.ts';
import { parseDoubleDouble } from '../../../detectors/spin/doubleDouble.ts';
import type { PulsarModel } from '../../../detectors/spin/pulsarModel.ts';
import { MODEL } from '../../alerts/samples.ts';

// What is written must be read again by the reader of the models folder, as the same model.

const folders: string[] = [];
afterAll(() => {
  for (const folder of folders) rmSync(folder, { recursive: true, force: true });
});

function readBack(model: PulsarModel): { readonly model: PulsarModel | undefined; readonly problems: ConfigProblem[] } {
  const folder = mkdtempSync(join(tmpdir(), 'spinvigil-model-'));
  folders.push(folder);
  writeFileSync(join(folder, 'one.toml'), pulsarFileText(model, ['A remark', 'of two lines']));
  const problems: ConfigProblem[] = [];
  const models = loadModels(folder, createKernelShelf(), problems);
  return { model: models?.get(model.name), problems };
}

const RICH: PulsarModel = {
  ...MODEL,
  name: 'KR "1902"\\-08 ν',
  rightAscensionRad: 4.983_120_917_3,
  declinationRad: -0.1407,
  positionEpochMjd: 59_000.5,
  properMotionMasPerYr: [3.1, -1e-7],
  dispersionMeasureSlope: { perYr: 1e-4, epochMjd: 58_000 },
  solarWindPerCm3: 7.9,
  ephemeris: 'built-in',
  spin: {
    epochTdb: { day: 61_149, fraction: 0.123_456_789_012_345_6 },
    frequencyHz: parseDoubleDouble('641.9282221278291234567890123')!,
    frequencyDerivativeHzPerS: -4.331e-14,
    frequencySecondDerivativeHzPerS2: 3e-27,
    higherFrequencyDerivatives: [-2e-36, 1e-44],
    phaseAtEpochTurns: -0.123_456_789,
  },
  glitches: [
    {
      epochTdb: { day: 60_000, fraction: 0.5 },
      phaseTurns: 0.01,
      frequencyStepHz: 2e-8,
      frequencyDerivativeStepHzPerS: -1e-15,
      recoveries: [
        { frequencyStepHz: 3e-9, timescaleDays: 12.5 },
        { frequencyStepHz: -3e-9, timescaleDays: 1 },
      ],
    },
    {
      epochTdb: { day: 60_900, fraction: 0.25 },
      phaseTurns: 0,
      frequencyStepHz: 1e-9,
      frequencyDerivativeStepHzPerS: 0,
      recoveries: [],
    },
  ],
  orbit: {
    form: 'keplerian',
    periodDays: 1.533_449_474_4,
    periodDerivative: 1e-12,
    projectedSemiMajorAxisS: 1.8979,
    projectedSemiMajorAxisDerivative: 1e-14,
    shapiroRangeS: 1e-6,
    shapiroShape: 0.9,
    periastronEpochTdb: { day: 55_000, fraction: 0.75 },
    eccentricity: 0.17,
    eccentricityDerivativePerS: 1e-16,
    periastronLongitudeRad: 0.5,
    periastronAdvanceRadPerS: 0,
    einsteinDelayS: 1e-3,
  },
  receivers: [
    { receiver: 'L', offsetUs: 12.5, uncertaintyUs: 0.1 },
    { receiver: 'L', site: 'Kestrel Ridge', offsetUs: -3, uncertaintyUs: 1 },
  ],
  noise: { uncertaintyScale: 1.3, floorUs: 20 },
  alerts: { extraRecipients: ['x@kestrel-ridge.example'], confirmLogOdds: 12 },
};

describe('a model written as a file of the models folder', () => {
  test.each([
    ['a plain one', MODEL],
    ['one with everything', RICH],
    [
      'one with a round orbit',
      {
        ...MODEL,
        orbit: {
          form: 'small eccentricity',
          periodDays: 12.3,
          periodDerivative: 0,
          projectedSemiMajorAxisS: 9.2,
          projectedSemiMajorAxisDerivative: 0,
          shapiroRangeS: 0,
          shapiroShape: 0,
          ascendingNodeEpochTdb: { day: 55_000, fraction: 0 },
          eccentricitySine: 1e-5,
          eccentricitySineDerivativePerS: 0,
          eccentricityCosine: -2e-5,
          eccentricityCosineDerivativePerS: 0,
        },
      } as PulsarModel,
    ],
  ])('%s is read again as it was', (_, model) => {
    const { model: read, problems } = readBack(model);
    expect(problems.filter(({ severity }) => severity === 'error')).toEqual([]);
    // Degrees and radians are turned into each other: one unit in the last place, 1e-10 of an arc second.
    const { rightAscensionRad, declinationRad, spin, ...rest } = model;
    expect(read).toMatchObject(rest);
    const { frequencyHz, ...others } = spin;
    expect(read!.spin).toMatchObject(others);
    expect(read!.spin.frequencyHz.hi).toBe(frequencyHz.hi);
    expect(Math.abs(read!.spin.frequencyHz.lo - frequencyHz.lo)).toBeLessThan(1e-30 * frequencyHz.hi);
    expect(Math.abs(read!.rightAscensionRad - rightAscensionRad)).toBeLessThan(2e-15);
    expect(Math.abs(read!.declinationRad - declinationRad)).toBeLessThan(2e-15);
  });
});
