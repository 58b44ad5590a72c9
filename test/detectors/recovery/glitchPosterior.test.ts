import { describe, expect, it } from 'vitest';
import type { CountedArrival, Disturbance } from '../../../detectors/filter/countedArrival.ts';
import { eventFrame } from '../../../detectors/recovery/eventFrame.ts';
import { gapSystem, recoveryColumns } from '../../../detectors/recovery/gapSystem.ts';
import { explore, type GlitchPoint, pointsAt } from '../../../detectors/recovery/glitchPosterior.ts';
import { type DenseFit, denseFit } from '../../support/denseLeastSquares.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

const walks = { phaseWalk: 1e-8, frequencyWalk: 1e-10, torqueWalk: 1e-15 };
const noise = { ...walks, uncertaintyScale: 1.3, floorTurns: 4e-4 };
/** Widths of the size prior, turns and days. */
const scale = { rate: 0.02, second: 1e-4, decay: 0.015, logShare: 0 };

describe('the posterior at one epoch and timescale', () => {
  const random = dice(31);
  const days = observingDays(60, 4, 0.8, random);
  const after = 38;
  const arrivals: CountedArrival[] = simulateArrivals(days, walks, 1e-3, random).map((arrival, i) => ({
    ...arrival,
    deviationTurns: arrival.deviationTurns - (i < after ? 0 : 0.004 * (days[i]! - days[after]! + 1.5)),
    group: i % 3 === 0 ? 1 : 0,
    frequencyMhz: i % 2 === 0 ? 700 : 1400,
  }));
  const disturbances: Disturbance[] = [
    { beforeIndex: 15, kind: 'offset', group: 1 },
    { beforeIndex: 20, kind: 'dispersion' },
  ];
  const frame = eventFrame({
    arrivals,
    noise,
    firstGapBeforeIndex: after,
    lastGapBeforeIndex: after,
    disturbances,
    otherRecoveries: [{ beforeIndex: 25, timescaleDays: 12 }],
  });
  const system = gapSystem(frame, frame.gaps[0]!);

  function points(timescalesDays: readonly number[]): GlitchPoint[] {
    const posterior = explore(frame, system, recoveryColumns(frame, system, timescalesDays), [scale]);
    return posterior.spots.flatMap((spot) => pointsAt(posterior, spot, [scale], spot.logMass));
  }

  /** Dense generalised least squares with every column written out. */
  function dense(epochDays: number, timescalesDays: readonly number[], countShift = 0): DenseFit {
    const since = (t: number): number => Math.max(0, t - epochDays);
    const column = (value: (t: number, i: number) => number) => Float64Array.from(days, value);
    const glitch = [
      column((t) => -since(t)),
      column((t) => -0.5 * since(t) ** 2),
      ...timescalesDays.map((tau) => column((t) => -tau * (1 - Math.exp(-since(t) / tau)))),
    ];
    const flat = [
      column(() => 1),
      column((t) => t / 200),
      column((t) => (t / 200) ** 2),
      column((_, i) => arrivals[i]!.group),
      column((_, i) => (1400 / arrivals[i]!.frequencyMhz) ** 2),
      column((_, i) => (i >= 15 ? arrivals[i]!.group : 0)),
      column((_, i) => (i >= 20 ? (1400 / arrivals[i]!.frequencyMhz) ** 2 : 0)),
      column((t, i) => (i >= 25 ? Math.exp(-(t - days[25]!) / 12) : 0)),
    ];
    // "Flat": so wide that it moves nothing at the precision compared.
    const priorSd = [scale.rate, scale.second, ...timescalesDays.map(() => scale.decay), ...flat.map(() => 1e5)];
    const variances = days.map(() => 1.3e-3 ** 2 + 4e-4 ** 2);
    const y = Float64Array.from(arrivals, ({ deviationTurns }, i) => deviationTurns + (i < after ? 0 : countShift));
    return denseFit(days, variances, walks, [...glitch, ...flat], y, priorSd);
  }

  function expectTwin(point: GlitchPoint, twin: DenseFit): void {
    const count = point.mean.length;
    const p = Math.sqrt(twin.covariance.length);
    const sd = (i: number) => Math.sqrt(twin.covariance[i * p + i]!);
    for (let a = 0; a < count; a++) {
      expect(Math.abs(point.mean[a]! - twin.solution[a]!) / sd(a)).toBeLessThan(1e-6);
      for (let b = 0; b < count; b++)
        expect(Math.abs(point.covariance[a * count + b]! - twin.covariance[a * p + b]!) / (sd(a) * sd(b))).toBeLessThan(
          1e-6,
        );
    }
  }

  const models = [[], [3], [25], [200], [4, 30], [2.5, 3], [2, 15, 120], [30, 40, 60]];

  it.each(models)('is dense generalised least squares, with exponentials %j, %j, %j', (...timescales) => {
    const all = points(timescales);
    expect(all.length).toBeGreaterThan(10);
    const heaviest = all.reduce((a, b) => (b.logDensity > a.logDensity ? b : a));
    const reference = dense(heaviest.epochDays, timescales, heaviest.countShift);
    for (const point of all.filter((_, k) => k % 5 === 0)) {
      const twin = dense(point.epochDays, timescales, point.countShift);
      expectTwin(point, twin);
      const difference = point.logDensity - heaviest.logDensity;
      expect(Math.abs(difference - (twin.logLikelihood - reference.logLikelihood))).toBeLessThan(1e-6);
    }
  });

  it('weighs glitches with and without exponentials on one scale', () => {
    const plain = points([])[0]!;
    for (const timescales of models.slice(1)) {
      const decaying = points(timescales)[0]!;
      const expected =
        dense(decaying.epochDays, timescales, decaying.countShift).logLikelihood -
        dense(plain.epochDays, [], plain.countShift).logLikelihood;
      expect(Math.abs(decaying.logDensity - plain.logDensity - expected)).toBeLessThan(1e-6);
    }
  });
});

describe('how well a size can be known at best', () => {
  // Cramér–Rao: σ(Δν) = c σ_φ/T for evenly spaced arrivals, epoch known in mid-gap, phase, ν and ν̇ refitted, white
  // noise; factors c computed independently with numpy (facts of the trade, derived).
  it.each([
    [20, 2, 0.895, false],
    [20, 5, 0.346, false],
    [60, 3, 0.401, false],
    [60, 5, 0.206, false],
    [60, 20, 0.0548, false],
    [60, 5, 0.723, true],
    [60, 10, 0.279, true],
  ])('%d arrivals before and %d after: c = %d', (before, post, factor, derivative) => {
    const arrivals = Array.from(
      { length: before + post },
      (_, i): CountedArrival => ({
        tDays: i,
        deviationTurns: 0,
        sigmaTurns: 1e-3,
        frequencyMhz: 1400,
        group: 0,
        used: true,
      }),
    );
    const frame = eventFrame({
      arrivals,
      noise: { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0, uncertaintyScale: 1, floorTurns: 0 },
      firstGapBeforeIndex: before,
      lastGapBeforeIndex: before,
      disturbances: [],
    });
    const system = gapSystem(frame, frame.gaps[0]!);
    const wide = { rate: 1e3, second: derivative ? 1e3 : 1e-12, decay: 0, logShare: 0 };
    const posterior = explore(frame, system, recoveryColumns(frame, system, []), [wide]);
    const points = posterior.spots.flatMap((spot) => pointsAt(posterior, spot, [wide], spot.logMass));
    const middle = points.find(({ epochDays }) => Math.abs(epochDays - (before - 0.5)) < 1e-9)!;
    expect(Math.sqrt(middle.covariance[0]!) / 1e-3 / factor).toBeCloseTo(1, 2);
  });
});
