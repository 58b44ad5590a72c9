import { readFileSync } from 'node:fs';
import type { ReceivedArrival } from '../../detectors/arrival.ts';
import type { EarthOrientationTable } from '../../detectors/sky/earthOrientation.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { type LeapSecondTable, parseLeapSeconds } from '../../detectors/time/leapSeconds.ts';
import { parseMjd } from '../../detectors/time/mjd.ts';

/** A pulsar of which only the place, its motion and the dispersion matter. */
export function pulsarAt(place: Partial<PulsarModel>): PulsarModel {
  return {
    name: 'KR 0417+31',
    rightAscensionRad: 1.1,
    declinationRad: 0.54,
    positionEpochMjd: 59_000,
    properMotionMasPerYr: [3.1, -7.4],
    parallaxMas: 0.8,
    dispersionMeasure: 41.27,
    spin: {
      epochTdb: { day: 59_000, fraction: 0 },
      frequencyHz: { hi: 6.3417701123349, lo: 0 },
      frequencyDerivativeHzPerS: -4.113e-13,
      frequencySecondDerivativeHzPerS2: 0,
    },
    glitches: [],
    noise: {},
    alerts: { extraRecipients: [] },
    ...place,
  };
}

export function arrivalAt(timeText: string, frequencyMhz: number, timeScale: 'UTC' | 'TDB' = 'UTC'): ReceivedArrival {
  const time = parseMjd(timeText);
  if (time === null) throw new Error(`not an MJD: ${timeText}`);
  return {
    pulsar: 'KR 0417+31',
    timeText,
    timeScale,
    time,
    uncertaintyUs: 10,
    frequencyMhz,
    site: 'ridge',
    receiver: '',
    pulseNumber: null,
    signalToNoise: null,
    note: null,
  };
}

/** The same Earth orientation on all dates. */
export function orientationOf(ut1MinusUtcS: number, xArcsec: number, yArcsec: number): EarthOrientationTable {
  return {
    name: 'constant',
    mjdUtc: Float64Array.of(0, 100_000),
    ut1MinusUtcS: Float64Array.of(ut1MinusUtcS, ut1MinusUtcS),
    xArcsec: Float64Array.of(xArcsec, xArcsec),
    yArcsec: Float64Array.of(yArcsec, yArcsec),
  };
}

/** The list that ships with the program. */
export function leapSecondTable(): LeapSecondTable {
  const file = new URL('../../daemon/tables/leap-seconds.list', import.meta.url);
  const parsed = parseLeapSeconds(readFileSync(file, 'utf8'));
  if ('problem' in parsed) throw new Error(parsed.problem);
  return parsed.table;
}
