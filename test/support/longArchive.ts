import type { TimedArrival } from '../../detectors/arrival.ts';
import { noisePrior } from '../../detectors/filter/noisePrior.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { addSeconds, normalMjd } from '../../detectors/time/mjd.ts';
import { type Dice, simulateWalk } from './simulatedPulsar.ts';
import { modelOf } from './simulatedWatch.ts';

/**
 * Forty years of one pulsar as a long programme has them: up to three telescopes, receivers that follow each other with unknown
 * offsets, gaps of months, a start model fitted to the first year, a position that is slightly wrong, noise as published
 * populations have it, arrivals that are simply wrong, and glitches.
 */
export interface LongArchive {
  readonly model: PulsarModel;
  readonly arrivals: readonly TimedArrival[];
  readonly glitches: readonly PlantedGlitch[];
  readonly years: number;
}

export interface PlantedGlitch {
  readonly tDays: number;
  readonly relativeSize: number;
  /** Share of it that decays again. */
  readonly recovering: number;
  readonly timescaleDays: number;
  /** Δν̇/ν̇ */
  readonly rateStep: number;
  /** Turns that it makes in 100 days over the turns by which errors and noise hide it. */
  readonly signalToNoise: number;
}

export const EPOCH_MJD = 44_000;
const YEARS = 40;
const DAYS_PER_YEAR = 365.25;
const SECONDS_PER_DAY = 86_400;
/** Light time of 1 au times one arcsecond, s. */
const SECONDS_PER_ARCSECOND = 499 * 4.848e-6;
const OUTLIER_SHARE = 0.01;

interface Row {
  readonly tDays: number;
  readonly site: string;
  readonly receiver: string;
  readonly uncertaintyUs: number;
  readonly frequencyMhz: number;
}

function logUniform({ uniform }: Dice, low: number, high: number): number {
  return low * (high / low) ** uniform();
}

export function longArchive(random: Dice): LongArchive {
  const { uniform, normal } = random;
  const isFast = uniform() < 0.1;
  const nu = isFast ? logUniform(random, 80, 600) : logUniform(random, 0.4, 12);
  const nuDot = isFast ? -logUniform(random, 1e-16, 3e-15) : -nu * nu * logUniform(random, 1e-17, 1e-12 / nu);
  const walks = drawnWalks(random, nu, nuDot);
  const errorUs = isFast ? logUniform(random, 1, 20) : logUniform(random, 40, 2000);
  const rows = schedule(random, errorUs);
  const scale = logUniform(random, 0.8, 2);
  const offsets = new Map<string, number>();
  for (const row of rows) {
    const sign = uniform() < 0.5 ? -1 : 1;
    if (!offsets.has(nameOf(row))) offsets.set(nameOf(row), offsets.size && sign * logUniform(random, 1e-5, 0.05));
  }
  const noise = Math.hypot(
    scale * errorUs * 1e-6 * nu,
    Math.sqrt((walks.frequencyWalk * 100 ** 3) / 3 + (walks.torqueWalk * 100 ** 5) / 20),
  );
  const glitches = isFast || uniform() < 0.4 ? [] : drawnGlitches(random, nu, noise);
  // Fast pulsars are timed precisely: their positions are known better too.
  const arcsecond = SECONDS_PER_ARCSECOND * nu;
  const position = logUniform(random, 0.003, 0.3) * arcsecond * (isFast ? 0.003 : 1);
  const motion = logUniform(random, 5e-4, 0.02) * arcsecond * (isFast ? 0.01 : 1);
  const season = 2 * Math.PI * uniform();
  const dispersion = (1e-3 * normal()) / 2.41e-4;
  const times = rows.map((row) => row.tDays);
  const walk = simulateWalk(times, walks, random);
  const deviations = rows.map((row, i) => {
    const years = row.tDays / DAYS_PER_YEAR;
    const annual = (position + motion * years) * Math.sin(2 * Math.PI * years + season);
    const late = offsets.get(nameOf(row))! + dispersion / row.frequencyMhz ** 2;
    const error = uniform() < OUTLIER_SHARE ? uniform() : scale * row.uncertaintyUs * 1e-6 * nu * normal();
    const stepped = glitches.reduce((sum, glitch) => sum + turnsOf(glitch, nu, nuDot, row.tDays), 0);
    return walk[i]! + stepped + annual + nu * late + error;
  });
  const model = modelOf({
    name: `KR ${Math.floor(1e4 * uniform())}`,
    frequencyHz: nu.toFixed(13),
    frequencyDerivativeHzPerS: nuDot,
    epochMjd: EPOCH_MJD,
  });
  return { model, arrivals: arrivalsOf(model, rows, withoutStart(rows, deviations)), glitches, years: YEARS };
}

function nameOf(row: Row): string {
  return `${row.site}|${row.receiver}`;
}

function drawnWalks({ uniform, normal }: Dice, nu: number, nuDot: number) {
  const prior = noisePrior(nu, nuDot);
  const draw = (p: { readonly median: number; readonly lnScatter: number }) =>
    p.median * Math.exp(p.lnScatter * normal());
  const which = uniform();
  return {
    phaseWalk: uniform() < 0.2 ? draw(prior.phaseWalk) : 0,
    frequencyWalk: which < 0.6 ? draw(prior.frequencyWalk) : 0,
    torqueWalk: which > 0.4 ? draw(prior.torqueWalk) : 0,
  };
}

function schedule(random: Dice, errorUs: number): Row[] {
  const { uniform } = random;
  const telescopes = [{ site: 'north', from: 0, to: YEARS }];
  if (uniform() < 0.5) telescopes.push({ site: 'east', from: 10 + 5 * uniform(), to: 25 + 10 * uniform() });
  telescopes.push({ site: 'south', from: 25 + 5 * uniform(), to: YEARS });
  const rows: Row[] = [];
  for (const { site, from, to } of telescopes) {
    const cadenceDays = logUniform(random, 4, 40);
    const receivers = 2 + Math.floor(4 * uniform());
    for (let tDays = from * DAYS_PER_YEAR; tDays < to * DAYS_PER_YEAR; ) {
      const part = (tDays / DAYS_PER_YEAR - from) / (to - from);
      const receiver = Math.min(receivers - 1, Math.floor(part * receivers));
      rows.push({
        tDays,
        site,
        receiver: `receiver ${receiver}`,
        uncertaintyUs: errorUs * logUniform(random, 0.6, 1.7) * (receiver === 0 ? 3 : 1),
        frequencyMhz: uniform() < 1 / 3 ? 600 : 1400,
      });
      tDays += cadenceDays * (0.2 + 1.6 * uniform());
      if (uniform() < 0.004) tDays += 60 + 400 * uniform();
    }
  }
  return rows.sort((a, b) => a.tDays - b.tDays);
}

function drawnGlitches(random: Dice, nu: number, noiseTurns: number): PlantedGlitch[] {
  const { uniform } = random;
  const glitches: PlantedGlitch[] = [];
  for (let n = 1 + Math.floor(3 * uniform()); n > 0; n--) {
    const relativeSize = uniform() < 0.55 ? logUniform(random, 3e-11, 3e-8) : logUniform(random, 1e-7, 1e-5);
    // Large glitches recover little (Yu et al. 2013, MNRAS 429, 688).
    const recovering = uniform() < 0.4 ? logUniform(random, 0.003, relativeSize > 1e-6 ? 0.05 : 0.5) : 0;
    glitches.push({
      tDays: (2 + 37 * uniform()) * DAYS_PER_YEAR,
      relativeSize,
      recovering,
      timescaleDays: logUniform(random, 10, 300),
      rateStep: logUniform(random, 1e-4, 2e-2),
      signalToNoise: (relativeSize * nu * SECONDS_PER_DAY * 100) / noiseTurns,
    });
  }
  glitches.sort((a, b) => a.tDays - b.tDays);
  return glitches.filter((glitch, i) => i === 0 || glitch.tDays - glitches[i - 1]!.tDays > 300);
}

/** Deviation that a glitch adds at a day, late positive. */
function turnsOf(glitch: PlantedGlitch, nu: number, nuDot: number, tDays: number): number {
  const since = tDays - glitch.tDays;
  if (since <= 0) return 0;
  const rate = glitch.relativeSize * nu * SECONDS_PER_DAY;
  const decaying = rate * glitch.recovering * glitch.timescaleDays * -Math.expm1(-since / glitch.timescaleDays);
  const torque = 0.5 * glitch.rateStep * nuDot * SECONDS_PER_DAY ** 2 * since * since;
  return -(rate * (1 - glitch.recovering) * since + decaying + torque);
}

/** Takes off the parabola through the first year, or the first twelve arrivals: the start model was fitted to them. */
function withoutStart(rows: readonly Row[], deviations: readonly number[]): number[] {
  const count = Math.max(12, rows.filter((row) => row.tDays < DAYS_PER_YEAR).length);
  const scale = rows[count - 1]!.tDays;
  const m = [0, 1, 2].map(() => [0, 0, 0, 0]);
  for (let i = 0; i < count; i++) {
    const powers = [1, rows[i]!.tDays / scale, (rows[i]!.tDays / scale) ** 2];
    for (const [r, row] of m.entries())
      for (let c = 0; c < 4; c++) row[c]! += powers[r]! * (c < 3 ? powers[c]! : deviations[i]!);
  }
  for (let p = 0; p < 3; p++)
    for (let r = 0; r < 3; r++) {
      if (r === p) continue;
      const factor = m[r]![p]! / m[p]![p]!;
      for (let c = p; c < 4; c++) m[r]![c]! -= factor * m[p]![c]!;
    }
  const [a, b, c] = m.map((row, i) => row[3]! / row[i]!) as [number, number, number];
  return rows.map(({ tDays }, i) => deviations[i]! - a - (b * tDays) / scale - c * (tDays / scale) ** 2);
}

function arrivalsOf(model: PulsarModel, rows: readonly Row[], deviations: readonly number[]): TimedArrival[] {
  const phaseAt = phaseEvaluator(model);
  const nu = model.spin.frequencyHz.hi;
  return rows.map((row, i) => {
    const near = normalMjd(EPOCH_MJD, row.tDays);
    const onTurn = addSeconds(near, -phaseAt(near).deviationTurns / nu);
    const { site, receiver, uncertaintyUs, frequencyMhz } = row;
    const tdb = addSeconds(onTurn, deviations[i]! / nu);
    return { key: String(i), tdb, uncertaintyUs, frequencyMhz, site, receiver, pulseNumber: null };
  });
}
