import { RECEIVERS, type Receiver } from './observatory.ts';

/** An invented pulsar: what the observatory believes of it, how it really turns, and how it is observed. */
export interface InventedPulsar {
  readonly name: string;
  /** ICRS, as the observatory has it; the truth lies about a milliarcsecond away. */
  readonly rightAscension: string;
  readonly declination: string;
  readonly properMotionMasPerYr: readonly [number, number];
  readonly parallaxMas: number;
  /** How far off the truth lies on each axis, where it is not a milliarcsecond. */
  readonly positionErrorMas?: number;
  /** pc cm⁻³, as the observatory has it; the truth lies about 0.0005 away. */
  readonly dispersionMeasure: number;
  /** The truth, at the middle of the start model's span. */
  readonly frequencyHz: string;
  readonly frequencyDerivativeHzPerS: number;
  /** RMS of the timing noise that a quadratic fit to one year leaves. */
  readonly timingNoiseUs: number;
  /** True scatter of the arrivals over their stated uncertainty. */
  readonly uncertaintyScale: number;
  /** About a companion, known to the observatory as it is. */
  readonly orbit?: InventedOrbit;
  readonly programme: readonly Observation[];
}

/** Keplerian: no precession, no decay. */
export interface InventedOrbit {
  readonly periodDays: number;
  /** Projected semi-major axis over the speed of light. */
  readonly semiMajorAxisLightS: number;
  readonly eccentricity: number;
  readonly periastronLongitudeDeg: number;
  readonly periastronMjd: number;
}

export interface Observation {
  readonly receiver: Receiver;
  readonly everyNights: number;
  /** The first of them, counted from the first night. */
  readonly startNight: number;
  /** Typical; single ones scatter about it. */
  readonly uncertaintyUs: number;
}

const { ridge700, ridge1400, annex1400, monitor600 } = RECEIVERS;

function observed(receiver: Receiver, everyNights: number, startNight: number, uncertaintyUs: number): Observation {
  return { receiver, everyNights, startNight, uncertaintyUs };
}

/** The annex works every third night. */
function atAnnex(uncertaintyUs: number): Observation {
  return observed(annex1400, 3, 1, uncertaintyUs);
}

export const PULSARS: readonly InventedPulsar[] = [
  {
    name: 'KR 0137+58',
    rightAscension: '01:37:44.2713',
    declination: '+58:14:22.918',
    properMotionMasPerYr: [-4.2, 1.9],
    parallaxMas: 0.4,
    dispersionMeasure: 32.164,
    frequencyHz: '1.4218864391207',
    frequencyDerivativeHzPerS: -2.611e-15,
    timingNoiseUs: 20,
    uncertaintyScale: 1.15,
    programme: [observed(ridge1400, 7, 2, 300)],
  },
  {
    name: 'KR 0417+31',
    rightAscension: '04:17:32.1140',
    declination: '+31:05:09.804',
    properMotionMasPerYr: [3.1, -7.4],
    parallaxMas: 0.8,
    dispersionMeasure: 41.27,
    frequencyHz: '6.3417701123349',
    frequencyDerivativeHzPerS: -4.113e-14,
    timingNoiseUs: 40,
    uncertaintyScale: 1.2,
    programme: [observed(ridge1400, 3, 0, 60), observed(ridge700, 6, 0, 55), atAnnex(45)],
  },
  {
    name: 'KR 0529+22',
    rightAscension: '05:29:08.7722',
    declination: '+22:40:31.273',
    properMotionMasPerYr: [1.4, -0.6],
    parallaxMas: 0.3,
    dispersionMeasure: 58.912,
    frequencyHz: '8.9302217754018',
    frequencyDerivativeHzPerS: -2.407e-13,
    timingNoiseUs: 90,
    uncertaintyScale: 1.1,
    programme: [observed(ridge1400, 2, 0, 140), observed(ridge700, 4, 1, 150)],
  },
  {
    name: 'KR 0834-21',
    rightAscension: '08:34:51.0387',
    declination: '-21:17:05.442',
    properMotionMasPerYr: [-12.7, 8.8],
    parallaxMas: 1.6,
    dispersionMeasure: 74.338,
    frequencyHz: '11.1937254103318',
    frequencyDerivativeHzPerS: -1.5704e-11,
    timingNoiseUs: 900,
    uncertaintyScale: 1.3,
    programme: [observed(ridge1400, 1, 0, 85), observed(ridge700, 6, 1, 110), observed(monitor600, 6, 3, 400)],
  },
  {
    name: 'KR 1018+07',
    rightAscension: '10:18:20.56138',
    declination: '+07:26:41.7705',
    properMotionMasPerYr: [5.8, -21.3],
    parallaxMas: 1.1,
    dispersionMeasure: 14.9031,
    frequencyHz: '214.70166329815044',
    frequencyDerivativeHzPerS: -8.126e-16,
    timingNoiseUs: 0.5,
    uncertaintyScale: 1.05,
    programme: [atAnnex(20), observed(ridge1400, 6, 0, 16)],
  },
  {
    name: 'KR 1152+44',
    rightAscension: '11:52:33.9021',
    declination: '+44:52:17.361',
    properMotionMasPerYr: [0.9, 2.2],
    parallaxMas: 0.5,
    dispersionMeasure: 22.746,
    frequencyHz: '2.8640197733562',
    frequencyDerivativeHzPerS: -6.03e-15,
    timingNoiseUs: 15,
    uncertaintyScale: 1.25,
    programme: [atAnnex(35), observed(ridge1400, 6, 3, 30)],
  },
  {
    name: 'KR 1309-12',
    rightAscension: '13:09:02.4180',
    declination: '-12:33:50.126',
    properMotionMasPerYr: [-2.0, -3.3],
    parallaxMas: 0.7,
    dispersionMeasure: 36.581,
    frequencyHz: '4.5233109927446',
    frequencyDerivativeHzPerS: -3.18e-14,
    timingNoiseUs: 35,
    uncertaintyScale: 1.15,
    programme: [observed(ridge1400, 3, 2, 32), observed(ridge700, 3, 2, 28)],
  },
  {
    name: 'KR 1546+39',
    rightAscension: '15:46:19.377',
    declination: '+39:08:44.05',
    properMotionMasPerYr: [0, 0],
    parallaxMas: 0,
    dispersionMeasure: 18.22,
    frequencyHz: '0.8318827450163',
    frequencyDerivativeHzPerS: -1.94e-15,
    timingNoiseUs: 60,
    uncertaintyScale: 1.4,
    programme: [observed(ridge1400, 7, 5, 1800)],
  },
  {
    name: 'KR 1733+15',
    rightAscension: '17:33:47.6610',
    declination: '+15:21:09.588',
    properMotionMasPerYr: [4.4, 4.1],
    parallaxMas: 0.6,
    dispersionMeasure: 29.407,
    frequencyHz: '5.1710446620935',
    frequencyDerivativeHzPerS: -1.72e-14,
    timingNoiseUs: 25,
    uncertaintyScale: 1.2,
    programme: [atAnnex(28)],
  },
  {
    name: 'KR 1921+27',
    rightAscension: '19:21:05.1194',
    declination: '+27:47:36.700',
    properMotionMasPerYr: [-3.6, 0.2],
    parallaxMas: 0.3,
    dispersionMeasure: 63.055,
    frequencyHz: '3.0528819400177',
    frequencyDerivativeHzPerS: -9.9e-15,
    timingNoiseUs: 30,
    uncertaintyScale: 1.1,
    programme: [atAnnex(40)],
  },
  {
    name: 'KR 2014+36',
    rightAscension: '20:14:58.2247',
    declination: '+36:02:55.813',
    properMotionMasPerYr: [-6.1, -5.5],
    parallaxMas: 0.5,
    dispersionMeasure: 112.83,
    frequencyHz: '15.9074481102963',
    frequencyDerivativeHzPerS: -3.3106e-11,
    timingNoiseUs: 3000,
    uncertaintyScale: 1.3,
    programme: [observed(ridge1400, 2, 1, 150)],
  },
  {
    name: 'KR 2246+09',
    rightAscension: '22:46:27.5035',
    declination: '+09:59:13.247',
    properMotionMasPerYr: [7.2, -1.0],
    parallaxMas: 0.9,
    dispersionMeasure: 26.118,
    frequencyHz: '1.9806620033571',
    frequencyDerivativeHzPerS: -4.4e-15,
    timingNoiseUs: 20,
    uncertaintyScale: 1.2,
    programme: [atAnnex(60), observed(ridge1400, 6, 5, 55)],
  },
];
