/**
 * Published glitches re-enacted: arrivals simulated with the published sizes must give them back within the stated intervals.
 * Sizes and sources as cited; ν and ν̇ of the pulsars, cadence and errors from memory.
 */
import { describe, expect, it } from 'vitest';
import { fitGlitch } from '../../../detectors/recovery/glitchFit.ts';
import type { Estimate } from '../../../detectors/recovery/mixture.ts';
import { withGlitch } from '../../support/simulatedGlitch.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

interface Published {
  readonly pulsar: string;
  readonly source: string;
  readonly frequencyHz: number;
  readonly derivativeHzPerS: number;
  readonly deltaNuHz: number;
  /** Parts of Δν that decay, with their timescales. */
  readonly recoveries?: readonly (readonly [fraction: number, timescaleDays: number])[];
  readonly cadenceDays: number;
  readonly before: number;
  readonly after: number;
  readonly sigmaTurns: number;
}

const PUBLISHED: readonly Published[] = [
  {
    pulsar: 'PSR J1709-4429, MJD 58178',
    source: 'Dunn et al. 2021, MNRAS 504, 3399: Δν/ν = 2432.2e-9',
    frequencyHz: 9.7543,
    derivativeHzPerS: -8.86e-12,
    deltaNuHz: 2432.2e-9 * 9.7543,
    cadenceDays: 3,
    before: 80,
    after: 40,
    sigmaTurns: 1e-3,
  },
  {
    pulsar: 'Vela, the smaller of two found late',
    source: 'Espinoza et al. 2021, A&A 647, A25: Δν/ν = 5.55e-9',
    frequencyHz: 11.19,
    derivativeHzPerS: -1.56e-11,
    deltaNuHz: 5.55e-9 * 11.19,
    cadenceDays: 1,
    before: 80,
    after: 40,
    sigmaTurns: 4e-4,
  },
  {
    pulsar: 'Vela, a large one as modelled over 21 years',
    source:
      'Shannon et al. 2016, MNRAS 459, 3104: no step in ν̇; a quarter of the step decays in 1300 d, a little in 25 d',
    frequencyHz: 11.19,
    derivativeHzPerS: -1.56e-11,
    deltaNuHz: 2e-6 * 11.19,
    recoveries: [
      [0.006, 25],
      [0.25, 1300],
    ],
    cadenceDays: 7,
    before: 80,
    after: 200,
    sigmaTurns: 1e-3,
  },
  {
    pulsar: 'PSR J0613-0200, the smallest known',
    source: 'McKee et al. 2016, MNRAS 461, 2809: Δν = 0.82 nHz',
    frequencyHz: 326.6,
    derivativeHzPerS: -1.02e-15,
    deltaNuHz: 0.82e-9,
    cadenceDays: 14,
    before: 150,
    after: 120,
    sigmaTurns: 3e-4,
  },
  {
    pulsar: 'PSR J1718-3718, the largest of a pulsar powered by rotation',
    source: 'Manchester & Hobbs 2011, ApJ 736, L31: Δν/ν = 33.25e-6',
    frequencyHz: 0.296,
    derivativeHzPerS: -1.4e-13,
    deltaNuHz: 33.25e-6 * 0.296,
    cadenceDays: 14,
    before: 60,
    after: 40,
    sigmaTurns: 3e-3,
  },
  {
    pulsar: 'PSR B0540-69, a spin-down glitch',
    source: 'Tuo et al. 2024, arXiv:2404.18158: Δν = -1.04e-7 Hz',
    frequencyHz: 19.7,
    derivativeHzPerS: -2.5e-10,
    deltaNuHz: -1.04e-7,
    cadenceDays: 3,
    before: 60,
    after: 40,
    sigmaTurns: 3e-3,
  },
  {
    pulsar: '1E 1841-045, a spin-down glitch of a magnetar',
    source: 'arXiv:1411.5274: Δν/ν = -5.8e-7',
    frequencyHz: 0.0849,
    derivativeHzPerS: -2.95e-13,
    deltaNuHz: -5.8e-7 * 0.0849,
    cadenceDays: 14,
    before: 60,
    after: 40,
    sigmaTurns: 1e-2,
  },
];

describe('published glitches, re-enacted', () => {
  it.each(PUBLISHED)('$pulsar ($source)', (event) => {
    const random = dice(71);
    const { frequencyHz, derivativeHzPerS, deltaNuHz, recoveries = [], before, sigmaTurns } = event;
    const days = observingDays(before + event.after, event.cadenceDays, 0.7, random);
    const walks = {
      phaseWalk: 1e-3 * sigmaTurns ** 2,
      frequencyWalk: (1e-2 * sigmaTurns ** 2) / 100 ** 3,
      torqueWalk: 0,
    };
    const epochDays = days[before]! - 0.4 * (days[before]! - days[before - 1]!);
    const decaying = recoveries.reduce((sum, [fraction]) => sum + fraction, 0);
    let arrivals = withGlitch(simulateArrivals(days, walks, sigmaTurns, random), {
      epochDays,
      persistentNuHz: deltaNuHz * (1 - decaying),
      persistentNuDotHzPerS: 0,
      decayingNuHz: 0,
      timescaleDays: 1,
    });
    for (const [fraction, timescaleDays] of recoveries)
      arrivals = withGlitch(arrivals, {
        epochDays,
        persistentNuHz: 0,
        persistentNuDotHzPerS: 0,
        decayingNuHz: fraction * deltaNuHz,
        timescaleDays,
      });
    const fit = fitGlitch({
      arrivals,
      noise: { ...walks, uncertaintyScale: 1, floorTurns: 0 },
      firstGapBeforeIndex: before,
      lastGapBeforeIndex: before,
      disturbances: [],
      frequencyHz,
      frequencyDerivativeHzPerS: derivativeHzPerS,
    });
    const holds = ({ interval95: [low, high] }: Estimate, value: number) => low <= value && value <= high;
    expect(fit.logEvidence - fit.logEvidenceNone).toBeGreaterThan(9);
    expect(holds(fit.deltaNuHz, deltaNuHz)).toBe(true);
    expect(fit.deltaNuHz.sd).toBeLessThan(0.2 * Math.abs(deltaNuHz));
    expect(holds(fit.epochDays, epochDays)).toBe(true);
    expect(fit.recovery?.terms.length ?? 0).toBe(recoveries.length);
    fit.recovery?.terms.forEach(({ timescaleDays, fraction, kind }, j) => {
      expect(kind).toBe('recovery');
      expect(holds(timescaleDays, recoveries[j]![1])).toBe(true);
      expect(holds(fraction, recoveries[j]![0])).toBe(true);
    });
  });

  it('a delayed rise: part of the step of PSR B0531+21 in 2017 arrived within days (from memory: 7 %, 1.7 d)', () => {
    const random = dice(72);
    const days = observingDays(160, 0.25, 0.5, random);
    const walks = { phaseWalk: 1e-10, frequencyWalk: 1e-14, torqueWalk: 0 };
    const deltaNuHz = 1.5e-5;
    const epochDays = days[80]! - 0.1;
    const arrivals = withGlitch(simulateArrivals(days, walks, 3e-4, random), {
      epochDays,
      persistentNuHz: deltaNuHz,
      persistentNuDotHzPerS: 0,
      decayingNuHz: -0.07 * deltaNuHz,
      timescaleDays: 1.7,
    });
    const fit = fitGlitch({
      arrivals,
      noise: { ...walks, uncertaintyScale: 1, floorTurns: 0 },
      firstGapBeforeIndex: 80,
      lastGapBeforeIndex: 80,
      disturbances: [],
      frequencyHz: 29.64,
      frequencyDerivativeHzPerS: -3.69e-10,
    });
    expect(fit.recovery?.terms).toHaveLength(1);
    const [term] = fit.recovery!.terms;
    expect(term!.kind).toBe('delayed rise');
    expect(Math.abs(term!.timescaleDays.median - 1.7)).toBeLessThan(0.2);
    expect(Math.abs(term!.fraction.median + 0.07)).toBeLessThan(0.01);
    // What arrives late is part of the step, and none of it is recovered.
    expect(Math.abs(fit.deltaNuHz.median / deltaNuHz - 1)).toBeLessThan(0.01);
    expect(fit.recovery!.q.median).toBeCloseTo(0, 6);
  });
});
