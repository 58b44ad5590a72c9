import type { MailSetting } from '../../alerts/composed.ts';
import type { NoticeContext } from '../../alerts/index.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import type { EventPicture, PicturePoint, PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';

/** Invented events of the invented observatory: what the tests of the alerts speak about. */

const NU_HZ = 6.3417701123349;
const EPOCH = 60_123.41;
const DELTA_NU_HZ = 2.03e-8;
const DELTA_NU_DOT = -1.1e-15;

export const GLITCH: PulsarEvent = {
  id: 'KR0417+31-60123-a',
  pulsar: 'KR 0417+31',
  state: 'confirmed',
  explanation: 'glitch',
  explanations: { glitch: 0.9982, wandering: 0.0011, 'spin-down-rate change': 0.0005, 'clock step': 0.0002, quiet: 0 },
  epochMjd: EPOCH,
  epochInterval68: [60_123.1, 60_123.8],
  epochInterval95: [60_122.9, 60_124.1],
  deltaNuHz: DELTA_NU_HZ,
  deltaNuHzInterval68: [1.9e-8, 2.16e-8],
  deltaNuHzInterval95: [1.78e-8, 2.29e-8],
  deltaNuOverNu: 3.2e-9,
  deltaNuOverNuInterval68: [3.0e-9, 3.41e-9],
  deltaNuDot: DELTA_NU_DOT,
  deltaNuDotInterval68: [-2.6e-15, 0.4e-15],
  deltaNuDotOverNuDot: 2.7e-3,
  deltaNuDotOverNuDotInterval68: [-1e-3, 6.3e-3],
  timeStepUs: null,
  timeStepUsInterval68: null,
  recovery: { terms: [], q: null },
  aliases: [{ deltaNuHz: DELTA_NU_HZ, probability: 1 }],
  firstArrivalMjd: 60_124.02,
  suspectedAtMjd: 60_125.03,
  confirmedAtMjd: 60_127.1,
  arrivalsUsed: 42,
  logBayesFactor: 31.2,
  falseAlertsPerYearAtThisLevel: 1e-9,
  pulsars: ['KR 0417+31'],
  site: null,
};

export const SITE_STEP: PulsarEvent = {
  ...GLITCH,
  id: 'site-Kestrel Ridge-60200',
  explanation: 'clock step',
  explanations: { 'clock step': 0.99997, glitch: 0.00001 },
  deltaNuHz: null,
  deltaNuHzInterval68: null,
  deltaNuHzInterval95: null,
  deltaNuOverNu: null,
  deltaNuOverNuInterval68: null,
  deltaNuDot: null,
  deltaNuDotInterval68: null,
  deltaNuDotOverNuDot: null,
  deltaNuDotOverNuDotInterval68: null,
  timeStepUs: 104.2,
  timeStepUsInterval68: [102.1, 106.3],
  aliases: [],
  pulsars: ['KR 0417+31', 'KR 1902-08', 'KR 2231+44'],
  site: 'Kestrel Ridge',
};

export const MODEL: PulsarModel = {
  name: 'KR 0417+31',
  rightAscensionRad: (64.3838083 * Math.PI) / 180,
  declinationRad: (31.0860278 * Math.PI) / 180,
  positionEpochMjd: 59_000,
  properMotionMasPerYr: [3.1, -7.4],
  parallaxMas: 0.8,
  dispersionMeasure: 41.27,
  spin: {
    epochTdb: { day: 59_000, fraction: 0 },
    frequencyHz: { hi: NU_HZ, lo: 0 },
    frequencyDerivativeHzPerS: -4.113e-13,
    frequencySecondDerivativeHzPerS2: 0,
  },
  glitches: [],
  noise: {},
  alerts: { extraRecipients: [] },
};

export const SETTING: MailSetting = {
  observatory: { name: 'Kestrel Ridge', contact: 'duty@kestrel-ridge.example' },
  from: 'Spin watch <spinvigil@kestrel-ridge.example>',
  timezone: 'Europe/Berlin',
  reviewUrl: 'http://127.0.0.1:8420',
  now: new Date('2023-07-02T03:10:00Z'),
};

/** A small generator with a fixed seed (multiplicative, modulus 2³¹ − 1): the sample picture is the same for ever. */
function uniform(seed: number): () => number {
  let state = seed;
  return () => {
    state = (state * 48_271) % 2_147_483_647;
    return state / 2_147_483_647;
  };
}

/** Some ninety days before and `daysAfter` after a step of `deltaNuHz`, one arrival in about two days. */
export function samplePicture({ deltaNuHz = DELTA_NU_HZ, daysAfter = 14, noiseTurns = 1.2e-3 } = {}): EventPicture {
  const next = uniform(41);
  const normal = () => Math.sqrt(-2 * Math.log(next())) * Math.cos(2 * Math.PI * next());
  const deviation = (mjd: number) => (mjd <= EPOCH ? 0 : -deltaNuHz * (mjd - EPOCH) * 86_400);
  const points: PicturePoint[] = [];
  for (let mjd = EPOCH - 90.3; mjd < EPOCH + daysAfter; mjd += 1.2 + 1.6 * next()) {
    const uncertaintyTurns = noiseTurns * (0.6 + 0.8 * next());
    const bad = points.length === 31;
    points.push({
      key: `a${points.length}`,
      mjd,
      deviationTurns: deviation(mjd) + uncertaintyTurns * (bad ? 9 : normal()),
      uncertaintyTurns,
      used: !bad,
    });
  }
  const range = (from: number, to: number, step: number): number[] => {
    const steps = Math.max(1, Math.ceil((to - from) / step));
    return Array.from({ length: steps + 1 }, (_, i) => from + ((to - from) * i) / steps);
  };
  const ends = [EPOCH - 90.3, EPOCH + daysAfter] as const;
  const track = range(EPOCH - 84, ends[1] - 2, 6).map((mjd) => ({
    mjd,
    deltaNuHz: (mjd > EPOCH ? deltaNuHz : 0) + 2.4e-9 * normal(),
    uncertaintyHz: 2.2e-9,
  }));
  return {
    points,
    fit: [...range(ends[0], EPOCH, 2), ...range(EPOCH, ends[1], 2)].map((mjd) => ({
      mjd,
      deviationTurns: deviation(mjd),
    })),
    frequencyTrack: track,
    frequencyFit: [
      { mjd: ends[0], deltaNuHz: 0 },
      { mjd: EPOCH, deltaNuHz: 0 },
      { mjd: EPOCH, deltaNuHz },
      { mjd: ends[1], deltaNuHz },
    ],
    epochMjd: EPOCH,
    epochInterval68: [60_123.1, 60_123.8],
    frequencyHz: NU_HZ,
  };
}

/** Of an update to a notice that was sent. */
export const CONTEXT: NoticeContext = {
  observatory: SETTING.observatory,
  model: MODEL,
  revision: 2,
  issuedAt: SETTING.now,
  cites: 1,
  drill: false,
};
