import { describe, expect, it } from 'vitest';
import type { CountedArrival, Disturbance } from '../../../detectors/filter/countedArrival.ts';
import { eventFrame } from '../../../detectors/recovery/eventFrame.ts';
import { gapSystem, recoveryColumn, withoutRecovery } from '../../../detectors/recovery/gapSystem.ts';
import { explore, type GlitchPoint } from '../../../detectors/recovery/glitchPosterior.ts';
import { type DenseFit, denseFit } from '../../support/denseLeastSquares.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

const walks = { phaseWalk: 1e-8, frequencyWalk: 1e-10, torqueWalk: 1e-15 };
const noise = { ...walks, uncertaintyScale: 1.3, floorTurns: 4e-4 };
/** Widths of the size prior, turns and days. */
const scale = { rate: 0.02, second: 1e-4 };

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
  });
  const system = gapSystem(frame, frame.gaps[0]!);

  /** Dense generalised least squares with every column written out. */
  function dense(epochDays: number, timescaleDays: number | null): DenseFit {
    const since = (t: number): number => Math.max(0, t - epochDays);
    const column = (value: (t: number, i: number) => number) => Float64Array.from(days, value);
    const glitch = [column((t) => -since(t)), column((t) => -0.5 * since(t) ** 2)];
    if (timescaleDays !== null) glitch.push(column((t) => -timescaleDays * (1 - Math.exp(-since(t) / timescaleDays))));
    const flat = [
      column(() => 1),
      column((t) => t / 200),
      column((t) => (t / 200) ** 2),
      column((_, i) => arrivals[i]!.group),
      column((_, i) => (1400 / arrivals[i]!.frequencyMhz) ** 2),
      column((_, i) => (i >= 15 ? arrivals[i]!.group : 0)),
      column((_, i) => (i >= 20 ? (1400 / arrivals[i]!.frequencyMhz) ** 2 : 0)),
    ];
    // "Flat": so wide that it moves nothing at the precision compared.
    const priorSd = [scale.rate, scale.second, scale.rate].slice(0, glitch.length).concat(flat.map(() => 1e6));
    const variances = days.map(() => 1.3e-3 ** 2 + 4e-4 ** 2);
    const y = Float64Array.from(arrivals, ({ deviationTurns }) => deviationTurns);
    return denseFit(days, variances, walks, [...glitch, ...flat], y, priorSd);
  }

  function expectTwin(point: GlitchPoint, twin: DenseFit, parameters: number): void {
    const p = Math.sqrt(twin.covariance.length);
    let entry = 0;
    for (let a = 0; a < 3; a++) {
      for (let b = a; b < 3; b++, entry++) {
        if (b >= parameters) continue;
        const sds = Math.sqrt(twin.covariance[a * p + a]! * twin.covariance[b * p + b]!);
        expect(Math.abs(point.covariance[entry]! - twin.covariance[a * p + b]!) / sds).toBeLessThan(1e-7);
      }
      if (a >= parameters) continue;
      const sd = Math.sqrt(twin.covariance[a * p + a]!);
      expect(Math.abs(point.mean[a]! - twin.solution[a]!) / sd).toBeLessThan(1e-6);
    }
  }

  it('is dense generalised least squares, without and with a recovery', () => {
    for (const timescaleDays of [null, 3, 25, 200]) {
      const recovery = timescaleDays === null ? withoutRecovery(system) : recoveryColumn(frame, system, timescaleDays);
      const { points } = explore(frame, system, recovery, [scale]);
      const unshifted = points.filter(({ countShift }) => countShift === 0);
      expect(unshifted.length).toBeGreaterThan(10);
      const heaviest = unshifted.reduce((a, b) => (b.logDensity > a.logDensity ? b : a));
      const reference = dense(heaviest.epochDays, timescaleDays);
      for (const point of unshifted.filter((_, k) => k % 7 === 0)) {
        const twin = dense(point.epochDays, timescaleDays);
        expectTwin(point, twin, timescaleDays === null ? 2 : 3);
        const difference = point.logDensity - heaviest.logDensity;
        expect(difference).toBeCloseTo(twin.logLikelihood - reference.logLikelihood, 6);
      }
    }
  });

  it('weighs a glitch with recovery against one without on one scale', () => {
    const at = (timescaleDays: number | null): GlitchPoint => {
      const recovery = timescaleDays === null ? withoutRecovery(system) : recoveryColumn(frame, system, timescaleDays);
      return explore(frame, system, recovery, [scale]).points.find(({ countShift }) => countShift === 0)!;
    };
    const plain = at(null);
    const decaying = at(25);
    const expected = dense(decaying.epochDays, 25).logLikelihood - dense(plain.epochDays, null).logLikelihood;
    expect(decaying.logDensity - plain.logDensity).toBeCloseTo(expected, 6);
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
    const wide = { rate: 1e3, second: derivative ? 1e3 : 1e-12 };
    const { points } = explore(frame, system, withoutRecovery(system), [wide]);
    const middle = points.find(({ epochDays }) => Math.abs(epochDays - (before - 0.5)) < 1e-9)!;
    expect(Math.sqrt(middle.covariance[0]) / 1e-3 / factor).toBeCloseTo(1, 2);
  });
});
