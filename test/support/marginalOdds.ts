/**
 * The odds of a glitch in one pulsar by a plain filter of its own, for many noise models: counts known, one receiver, no rival
 * explanations; its prior is the detector's. Marks of steps on the innovations after Willsky & Jones 1976 (IEEE Trans. Automatic Control 21, 108).
 */
import { learnNoise } from '../../detectors/filter/noiseLearning.ts';
import { withMargin } from '../../detectors/filter/noiseMargin.ts';
import { type NoisePrior, noisePrior } from '../../detectors/filter/noisePrior.ts';
import type { NoiseModel } from '../../detectors/report.ts';
import { GLITCH_RATE_SIZE, GLITCH_SIZES, RATE_PER_YEAR } from '../../detectors/steps/births.ts';

export interface SimplePulsar {
  readonly days: readonly number[];
  /** Turns, counted. */
  readonly deviations: readonly number[];
  readonly sigmaTurns: number;
  readonly frequencyHz: number;
  readonly frequencyDerivativeHzPerS: number;
}

/** By arrival: ln likelihood so far; ln of the odds of a glitch in any gap from the first looked at on, by prior rate. */
export interface Weighed {
  readonly logLikelihood: Float64Array;
  readonly logOdds: Float64Array;
}

const SECONDS_PER_DAY = 86_400;
const DAYS_PER_YEAR = 365.25;
/** Variances of the start: phase, rate, second derivative in turns and days. */
const START = [1, 1e-4, 1e-9] as const;

/** `look`: the first arrival whose odds are wanted; steps are looked for in the gaps from `from` on. */
export function weigh(pulsar: SimplePulsar, noise: NoiseModel, from: number, look: number): Weighed {
  const { days, deviations, sigmaTurns, frequencyHz, frequencyDerivativeHzPerS } = pulsar;
  const { phaseWalk: q1, frequencyWalk: q2, torqueWalk: q3 } = noise;
  const count = days.length;
  const logLikelihood = new Float64Array(count);
  const logOdds = new Float64Array(count).fill(Number.NEGATIVE_INFINITY);
  const error = (noise.uncertaintyScale * sigmaTurns) ** 2 + noise.floorTurns ** 2;
  const second = GLITCH_RATE_SIZE * Math.abs(frequencyDerivativeHzPerS) * SECONDS_PER_DAY ** 2;
  const sizes = GLITCH_SIZES.map(([share, size]) => ({ share, rate: size * frequencyHz * SECONDS_PER_DAY }));
  const marks: Mark[] = [];
  let [p00, p01, p02] = [START[0] as number, 0, 0];
  let [p11, p12, p22] = [START[1] as number, 0, START[2] as number];
  let [x0, x1, x2, sum] = [0, 0, 0, 0];
  for (let i = 0; i < count; i++) {
    const t = i === 0 ? 0 : days[i]! - days[i - 1]!;
    const h = (t * t) / 2;
    x0 += t * x1 + h * x2;
    x1 += t * x2;
    const [a01, a02] = [p01 + t * p11 + h * p12, p02 + t * p12 + h * p22];
    const a11 = p11 + t * p12;
    p00 = p00 + t * p01 + h * p02 + t * a01 + h * a02 + q1 * t + (q2 * t ** 3) / 3 + (q3 * t ** 5) / 20;
    p01 = a01 + t * a02 + q2 * h + (q3 * t ** 4) / 8;
    p02 = a02 + (q3 * t ** 3) / 6;
    p11 = a11 + t * (p12 + t * p22) + q2 * t + (q3 * t ** 3) / 3;
    p12 = p12 + t * p22 + q3 * h;
    p22 = p22 + q3 * t;
    for (const mark of marks) carry(mark, t);
    if (i >= from) marks.push(newMark(t));
    const variance = p00 + error;
    const innovation = deviations[i]! - x0;
    sum -= 0.5 * (innovation ** 2 / variance + Math.log(variance));
    logLikelihood[i] = sum;
    const gains = [p00 / variance, p01 / variance, p02 / variance] as const;
    for (const mark of marks) see(mark, innovation, variance, gains);
    x0 += gains[0] * innovation;
    x1 += gains[1] * innovation;
    x2 += gains[2] * innovation;
    [p11, p12, p22] = [p11 - gains[1] * p01, p12 - gains[1] * p02, p22 - gains[2] * p02];
    [p00, p01, p02] = [p00 - gains[0] * p00, p01 - gains[0] * p01, p02 - gains[0] * p02];
    if (i < look) continue;
    logOdds[i] = logSum(
      marks.flatMap((mark) =>
        sizes.map(({ share, rate }) => {
          const logRate = Math.log((share * RATE_PER_YEAR.glitch * mark.gapDays) / DAYS_PER_YEAR);
          return logRate + logBayesFactor(mark, rate, second);
        }),
      ),
    );
  }
  return { logLikelihood, logOdds };
}

/** A step of phase, rate and second derivative in one gap: what is left of it in the filter's error, and what arrivals told. */
interface Mark {
  readonly gapDays: number;
  readonly error: Float64Array;
  readonly information: Float64Array;
  readonly score: Float64Array;
}

function newMark(gapDays: number): Mark {
  const error = Float64Array.of(1, 0, 0, 0, 1, 0, 0, 0, 1);
  return { gapDays, error, information: new Float64Array(6), score: new Float64Array(3) };
}

function carry({ error }: Mark, t: number): void {
  for (let k = 0; k < 9; k += 3) {
    error[k]! += t * error[k + 1]! + ((t * t) / 2) * error[k + 2]!;
    error[k + 1]! += t * error[k + 2]!;
  }
}

function see(
  { error, information, score }: Mark,
  innovation: number,
  variance: number,
  gains: readonly [number, number, number],
): void {
  const shift = [error[0]!, error[3]!, error[6]!];
  let pair = 0;
  for (let a = 0; a < 3; a++) {
    score[a]! += (shift[a]! * innovation) / variance;
    for (let b = 0; b <= a; b++) information[pair++]! += (shift[a]! * shift[b]!) / variance;
    for (let j = 0; j < 3; j++) error[3 * a + j]! -= gains[j]! * shift[a]!;
  }
}

/** A rate step of σ `rate` somewhere in the gap, and one of the second derivative of σ `second`. */
function logBayesFactor({ gapDays: t, information: c, score: d }: Mark, rate: number, second: number): number {
  const [l00, l10, l11] = [(rate * t) / Math.sqrt(3), (rate * Math.sqrt(3)) / 2, rate / 2];
  const b = [l00 * d[0]! + l10 * d[1]!, l11 * d[1]!, second * d[2]!];
  const r00 = Math.sqrt(1 + l00 * l00 * c[0]! + 2 * l00 * l10 * c[1]! + l10 * l10 * c[2]!);
  const r10 = (l11 * (l00 * c[1]! + l10 * c[2]!)) / r00;
  const r11 = Math.sqrt(1 + l11 * l11 * c[2]! - r10 * r10);
  const r20 = (second * (l00 * c[3]! + l10 * c[4]!)) / r00;
  const r21 = (second * l11 * c[4]! - r20 * r10) / r11;
  const r22 = Math.sqrt(1 + second * second * c[5]! - r20 * r20 - r21 * r21);
  const y0 = b[0]! / r00;
  const y1 = (b[1]! - r10 * y0) / r11;
  const y2 = (b[2]! - r20 * y0 - r21 * y1) / r22;
  return 0.5 * (y0 * y0 + y1 * y1 + y2 * y2) - Math.log(r00 * r11 * r22);
}

export function logSum(terms: readonly number[]): number {
  const most = terms.reduce((a, b) => Math.max(a, b), Number.NEGATIVE_INFINITY);
  return most === Number.NEGATIVE_INFINITY
    ? most
    : most + Math.log(terms.reduce((sum, x) => sum + Math.exp(x - most), 0));
}

/** Natural-log odds by arrival after the first `before`, from which the noise is learned. */
export interface Odds {
  /** By the most probable noise, and by the one that is a standard deviation louder. */
  readonly likely: readonly number[];
  readonly louder: readonly number[];
  /** Averaged over the walks in frequency and torque, each side weighed by all arrivals: what a joint weighing makes of it. */
  readonly joint: readonly number[];
}

const GAPS_BEFORE = 30;
/** Strengths of a walk, in scatters of the prior. */
const STRENGTHS = Array.from({ length: 10 }, (_, k) => -2.5 + 0.6 * k);

export function oddsOf(pulsar: SimplePulsar, before: number): Odds {
  const prior = noisePrior(pulsar.frequencyHz, pulsar.frequencyDerivativeHzPerS);
  const counted = pulsar.days.slice(0, before).map((tDays, i) => ({
    tDays,
    deviationTurns: pulsar.deviations[i]!,
    sigmaTurns: pulsar.sigmaTurns,
    frequencyMhz: 1400,
    group: 0,
    used: true,
  }));
  const learned = learnNoise(counted, [], prior);
  const by = (noise: NoiseModel) => weigh(pulsar, noise, before - GAPS_BEFORE, before);
  const nodes = STRENGTHS.flatMap((a) =>
    STRENGTHS.map((b) => ({ logPrior: -(a * a + b * b) / 2, ...by(withWalks(learned, prior, a, b)) })),
  );
  const after = pulsar.days.map((_, i) => i).slice(before);
  const odds = ({ logOdds }: Weighed) => Array.from(logOdds.subarray(before));
  return {
    likely: odds(by(learned)),
    louder: odds(by(withMargin(learned, counted, [], prior, 0))),
    joint: after.map((i) => {
      const alone = nodes.map((n) => n.logPrior + n.logLikelihood[i]!);
      return logSum(nodes.map((n, k) => alone[k]! + n.logOdds[i]!)) - logSum(alone);
    }),
  };
}

function withWalks(learned: NoiseModel, prior: NoisePrior, frequency: number, torque: number): NoiseModel {
  const at = ({ median, lnScatter }: NoisePrior['frequencyWalk'], z: number) => median * Math.exp(lnScatter * z);
  return {
    ...learned,
    frequencyWalk: at(prior.frequencyWalk, frequency),
    torqueWalk: at(prior.torqueWalk, torque),
  };
}
