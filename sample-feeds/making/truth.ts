import { RADIANS_PER_MAS } from '../../detectors/sky/constants.ts';
import { parseDoubleDouble, toNumber } from '../../detectors/spin/doubleDouble.ts';
import type { KnownGlitch, PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { type Mjd, mjdNumber, normalMjd } from '../../detectors/time/mjd.ts';
import { type Chance, chance } from './chance.ts';
import { GLITCHES, type Glitch } from './happenings.ts';
import { FIRST_NIGHT_MJD, MODEL_SPAN_DAYS, NIGHTS } from './observatory.ts';
import { orbitDelay } from './orbit.ts';
import type { InventedPulsar } from './pulsars.ts';

/** How a pulsar really turns and where it really stands. */
export interface Truth {
  readonly model: PulsarModel;
  /** Turns by which random torque has carried it ahead of its spin-down. */
  readonly wander: (tdb: Mjd) => number;
  /** Whole turns apart from the nearest pulse, late positive, with everything that happened to it. */
  readonly turnsPastPulse: (tdb: Mjd) => number;
  /** How much later than the binary's own barycentre the pulsar is seen, for a pulse emitted then; 0 when it is alone. */
  readonly orbitDelayS: (emitted: Mjd) => number;
  readonly frequencyHz: number;
}

export const START_MJD = FIRST_NIGHT_MJD - MODEL_SPAN_DAYS;
export const SPIN_EPOCH_MJD = FIRST_NIGHT_MJD - MODEL_SPAN_DAYS / 2;
export const POSITION_EPOCH_MJD = 60_000;

const POSITION_ERROR_MAS = 1;
const DISPERSION_ERROR = 0.0005;

/** @param planted of all pulsars; those of this one are picked out */
export function truthOf(pulsar: InventedPulsar, planted: readonly Glitch[] = GLITCHES): Truth {
  const model = trueModel(pulsar, planted);
  const frequencyHz = toNumber(model.spin.frequencyHz);
  const wander = timingNoise(pulsar.timingNoiseUs * 1e-6 * frequencyHz, chance(`timing noise ${pulsar.name}`));
  const phase = phaseEvaluator(model);
  return {
    model,
    wander,
    turnsPastPulse: (tdb) => {
      const turns = phase(tdb).deviationTurns + wander(tdb);
      return turns - Math.round(turns);
    },
    orbitDelayS: pulsar.orbit === undefined ? () => 0 : orbitDelay(pulsar.orbit),
    frequencyHz,
  };
}

function trueModel(pulsar: InventedPulsar, planted: readonly Glitch[]): PulsarModel {
  const { normal } = chance(`catalogue errors ${pulsar.name}`);
  const catalogueDeclination = degrees(pulsar.declination) * (Math.PI / 180);
  const error = (pulsar.positionErrorMas ?? POSITION_ERROR_MAS) * RADIANS_PER_MAS;
  const spin = {
    epochTdb: normalMjd(SPIN_EPOCH_MJD, 0),
    frequencyHz: parseDoubleDouble(pulsar.frequencyHz),
    frequencyDerivativeHzPerS: pulsar.frequencyDerivativeHzPerS,
    frequencySecondDerivativeHzPerS2: 0,
  };
  return {
    name: pulsar.name,
    rightAscensionRad:
      degrees(pulsar.rightAscension) * 15 * (Math.PI / 180) + (error * normal()) / Math.cos(catalogueDeclination),
    declinationRad: catalogueDeclination + error * normal(),
    positionEpochMjd: POSITION_EPOCH_MJD,
    properMotionMasPerYr: pulsar.properMotionMasPerYr,
    parallaxMas: pulsar.parallaxMas,
    dispersionMeasure: pulsar.dispersionMeasure + DISPERSION_ERROR * normal(),
    spin,
    glitches: planted
      .filter((glitch) => glitch.pulsar === pulsar.name)
      .map((glitch) => glitchTerms(glitch, toNumber(spin.frequencyHz), spin.frequencyDerivativeHzPerS)),
    noise: {},
    alerts: { extraRecipients: [] },
  };
}

/** Sexagesimal text to degrees (or hours). */
export function degrees(text: string): number {
  const [whole, minutes, seconds] = text.replace(/^[+-]/, '').split(':').map(Number);
  return (text.startsWith('-') ? -1 : 1) * (whole! + minutes! / 60 + seconds! / 3600);
}

function glitchTerms(glitch: Glitch, frequencyHz: number, frequencyDerivativeHzPerS: number): KnownGlitch {
  const step = glitch.deltaNuOverNu * frequencyHz;
  const recovering = glitch.recoveries.reduce((total, { fraction }) => total + fraction, 0);
  // The recovery's own slope at the epoch belongs to Δν̇: what is left stays for good.
  return {
    epochTdb: normalMjd(0, glitch.epochMjd),
    phaseTurns: 0,
    frequencyStepHz: step * (1 - recovering),
    frequencyDerivativeStepHzPerS: glitch.deltaNuDotOverNuDot * frequencyDerivativeHzPerS,
    recoveries: glitch.recoveries.map(({ fraction, timescaleDays }) => ({
      frequencyStepHz: fraction * step,
      timescaleDays,
    })),
  };
}

/** RMS of a walk at the end of a span over what a quadratic fit to the span leaves (own simulation; see detectors/filter/noisePrior.ts). */
const END_OVER_RESIDUAL = { frequency: 29.2, torque: 53.0 };
const REFERENCE_SPAN_DAYS = 365.25;
const STEP_DAYS = 0.25;

/** Random walks in frequency and in torque that share the residual variance; turns as a function of time. */
function timingNoise(residualTurns: number, { normal }: Chance): (tdb: Mjd) => number {
  const variance = residualTurns ** 2 / 2;
  const frequencyWalk = (3 * END_OVER_RESIDUAL.frequency ** 2 * variance) / REFERENCE_SPAN_DAYS ** 3;
  const torqueWalk = (20 * END_OVER_RESIDUAL.torque ** 2 * variance) / REFERENCE_SPAN_DAYS ** 5;
  const grid: { phase: number; rate: number; torque: number }[] = [{ phase: 0, rate: 0, torque: 0 }];
  for (let day = 0; day < MODEL_SPAN_DAYS + NIGHTS + 2; day += STEP_DAYS) {
    const { phase, rate, torque } = grid.at(-1)!;
    grid.push({
      phase: phase + rate * STEP_DAYS + (torque * STEP_DAYS ** 2) / 2,
      rate: rate + torque * STEP_DAYS + Math.sqrt(frequencyWalk * STEP_DAYS) * normal(),
      torque: torque + Math.sqrt(torqueWalk * STEP_DAYS) * normal(),
    });
  }
  return (tdb) => {
    const days = mjdNumber(tdb) - START_MJD;
    const before = Math.floor(days / STEP_DAYS);
    const node = grid[before];
    if (node === undefined) throw new RangeError(`timing noise was not made for MJD ${mjdNumber(tdb)}`);
    const rest = days - before * STEP_DAYS;
    return node.phase + rest * (node.rate + (rest * node.torque) / 2);
  };
}
