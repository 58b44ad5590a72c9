import type { Glitch } from '../making/happenings.ts';
import { RECEIVERS, type Receiver } from '../making/observatory.ts';
import type { InventedPulsar } from '../making/pulsars.ts';

/** Five invented pulsars, one of each kind that a programme may hold, and what was planted in them. */

export type Kind = 'ordinary' | 'young' | 'millisecond binary' | 'accreting' | 'magnetar';

export interface PulsarOfKind extends InventedPulsar {
  readonly kind: Kind;
}

const { ridge1400 } = RECEIVERS;

/** A telescope in orbit: its team delivers times at the barycentre, in TDB, and there is no dispersion in X-rays. */
const ORBITING: Receiver = {
  name: 'x-ray counter',
  feed: 'x-ray',
  site: 'barycentre',
  frequencyMhz: Number.POSITIVE_INFINITY,
  delayUs: 40,
};

export const PULSARS_OF_KINDS: readonly PulsarOfKind[] = [
  {
    kind: 'ordinary',
    name: 'KR 0312+46',
    rightAscension: '03:12:27.9034',
    declination: '+46:19:50.712',
    properMotionMasPerYr: [2.6, -5.1],
    parallaxMas: 0.5,
    dispersionMeasure: 37.481,
    frequencyHz: '1.7340921866512',
    frequencyDerivativeHzPerS: -3.362e-15,
    timingNoiseUs: 40,
    uncertaintyScale: 1.2,
    programme: [{ receiver: ridge1400, everyNights: 5, startNight: 1, uncertaintyUs: 150 }],
  },
  {
    kind: 'young',
    name: 'KR 0658-14',
    rightAscension: '06:58:13.2207',
    declination: '-14:41:09.338',
    properMotionMasPerYr: [-9.4, 3.7],
    parallaxMas: 0.4,
    dispersionMeasure: 96.203,
    frequencyHz: '13.6102884571903',
    frequencyDerivativeHzPerS: -2.1174e-11,
    timingNoiseUs: 2000,
    uncertaintyScale: 1.3,
    programme: [{ receiver: ridge1400, everyNights: 3, startNight: 0, uncertaintyUs: 120 }],
  },
  {
    kind: 'millisecond binary',
    name: 'KR 1427-05',
    rightAscension: '14:27:51.740318',
    declination: '-05:22:36.10974',
    properMotionMasPerYr: [4.9, -8.2],
    parallaxMas: 1.2,
    positionErrorMas: 0.02,
    dispersionMeasure: 19.6044,
    frequencyHz: '300.18274466190573',
    frequencyDerivativeHzPerS: -6.04e-16,
    timingNoiseUs: 0.2,
    uncertaintyScale: 1.1,
    orbit: {
      periodDays: 5.7410461,
      semiMajorAxisLightS: 3.3666918,
      eccentricity: 1.94e-3,
      periastronLongitudeDeg: 176.2,
      periastronMjd: 60_551.07412,
    },
    programme: [{ receiver: ridge1400, everyNights: 4, startNight: 2, uncertaintyUs: 1 }],
  },
  {
    kind: 'accreting',
    name: 'KR 1839-26',
    rightAscension: '18:39:40.18',
    declination: '-26:07:51.4',
    properMotionMasPerYr: [0, 0],
    parallaxMas: 0,
    dispersionMeasure: 0,
    frequencyHz: '1.2407731918',
    frequencyDerivativeHzPerS: 2.31e-12,
    timingNoiseUs: 1.2e6,
    uncertaintyScale: 1.2,
    orbit: {
      periodDays: 11.583062,
      semiMajorAxisLightS: 26.4417,
      eccentricity: 0.118,
      periastronLongitudeDeg: 61.3,
      periastronMjd: 60_548.3317,
    },
    programme: [{ receiver: ORBITING, everyNights: 2, startNight: 0, uncertaintyUs: 3000 }],
  },
  {
    kind: 'magnetar',
    name: 'KR 2107+52',
    rightAscension: '21:07:08.91',
    declination: '+52:33:17.6',
    properMotionMasPerYr: [0, 0],
    parallaxMas: 0,
    dispersionMeasure: 0,
    frequencyHz: '0.1433076218',
    frequencyDerivativeHzPerS: -9.61e-15,
    timingNoiseUs: 20_000,
    uncertaintyScale: 1.2,
    programme: [{ receiver: ORBITING, everyNights: 10, startNight: 3, uncertaintyUs: 30_000 }],
  },
];

export const GLITCHES_OF_KINDS: readonly Glitch[] = [
  {
    pulsar: 'KR 0658-14',
    epochMjd: 60_841.27,
    deltaNuOverNu: 2.27e-6,
    deltaNuDotOverNuDot: 9.1e-3,
    recoveries: [{ fraction: 0.012, timescaleDays: 14 }],
  },
  // The magnetar is slowed down, as one was seen to be (Archibald et al. 2013, Nature 497, 591: −3.1e-7).
  { pulsar: 'KR 2107+52', epochMjd: 60_862.9, deltaNuOverNu: -3.4e-7, deltaNuDotOverNuDot: 0, recoveries: [] },
];
