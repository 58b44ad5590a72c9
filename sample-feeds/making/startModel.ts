import { addSeconds, daysBetween, type Mjd, normalMjd, SECONDS_PER_DAY } from '../../detectors/time/mjd.ts';
import { chance } from './chance.ts';
import { FIRST_NIGHT_MJD, MODEL_SPAN_DAYS } from './observatory.ts';
import type { InventedPulsar } from './pulsars.ts';
import { POSITION_EPOCH_MJD, SPIN_EPOCH_MJD, START_MJD, type Truth } from './truth.ts';

/**
 * The model that the observatory starts from: ν and ν̇ fitted to arrivals of the same programme in the 60 days before the
 * first night. It is wrong as real ones are, by what those arrivals and the timing noise in them allow.
 */
export function startModel(pulsar: InventedPulsar, truth: Truth): string {
  const [rateError, derivativeError] = fitErrors(pulsar, truth);
  const frequencyHz = truth.model.spin.frequencyHz.hi + (truth.model.spin.frequencyHz.lo + rateError);
  const derivative = pulsar.frequencyDerivativeHzPerS + derivativeError;
  const [alphaMotion, deltaMotion] = pulsar.properMotionMasPerYr;
  return `name = "${pulsar.name}"
right_ascension = "${pulsar.rightAscension}"
declination = "${pulsar.declination}"
position_epoch_mjd = ${POSITION_EPOCH_MJD}
proper_motion_mas_per_yr = [${alphaMotion.toFixed(1)}, ${deltaMotion.toFixed(1)}]
parallax_mas = ${pulsar.parallaxMas.toFixed(1)}
dispersion_measure = ${pulsar.dispersionMeasure}

[spin] # fitted to MJD ${START_MJD} to ${FIRST_NIGHT_MJD}
time_scale = "TDB"
ephemeris = "built-in"
epoch_mjd = "${SPIN_EPOCH_MJD}.0"
frequency_hz = "${frequencyHz.toPrecision(16)}"
frequency_derivative = "${derivative.toExponential(8)}"
frequency_second_derivative = "0"
`;
}

interface Residual {
  /** Since the spin epoch. */
  readonly seconds: number;
  readonly turns: number;
  readonly uncertaintyTurns: number;
}

/** Weighted least squares for offset, ν and ν̇ on what the truth leaves; returns the errors of ν (Hz) and ν̇ (Hz/s). */
function fitErrors(pulsar: InventedPulsar, truth: Truth): readonly [number, number] {
  const halfSpan = (MODEL_SPAN_DAYS / 2) * SECONDS_PER_DAY;
  const normal = [0, 1, 2].map(() => [0, 0, 0, 0]);
  for (const { seconds, turns, uncertaintyTurns } of residuals(pulsar, truth)) {
    const x = seconds / halfSpan;
    const row = [1, x, x * x, turns];
    for (let i = 0; i < 3; i++) {
      for (let j = 0; j < 4; j++) normal[i]![j]! += (row[i]! * row[j]!) / uncertaintyTurns ** 2;
    }
  }
  const [, rate, curvature] = solved(normal);
  return [rate! / halfSpan, (2 * curvature!) / halfSpan ** 2];
}

function residuals(pulsar: InventedPulsar, { wander, frequencyHz }: Truth): Residual[] {
  const { even, normal } = chance(`start model ${pulsar.name}`);
  const epoch: Mjd = normalMjd(SPIN_EPOCH_MJD, 0);
  return pulsar.programme.flatMap(({ everyNights, uncertaintyUs }) => {
    const made: Residual[] = [];
    for (let day = START_MJD; day < FIRST_NIGHT_MJD; day += everyNights) {
      const tdb = addSeconds({ day, fraction: 0 }, even() * SECONDS_PER_DAY);
      const uncertaintyTurns = uncertaintyUs * 1e-6 * frequencyHz;
      made.push({
        seconds: daysBetween(tdb, epoch) * SECONDS_PER_DAY,
        turns: wander(tdb) + uncertaintyTurns * pulsar.uncertaintyScale * normal(),
        uncertaintyTurns,
      });
    }
    return made;
  });
}

/** Gauss elimination of a positive definite system, in place; each row carries its right-hand side. */
function solved(rows: number[][]): number[] {
  const size = rows.length;
  for (let pivot = 0; pivot < size; pivot++) {
    for (let row = 0; row < size; row++) {
      if (row === pivot) continue;
      const factor = rows[row]![pivot]! / rows[pivot]![pivot]!;
      for (let column = pivot; column <= size; column++) rows[row]![column]! -= factor * rows[pivot]![column]!;
    }
  }
  return rows.map((row, i) => row[size]! / row[i]!);
}
