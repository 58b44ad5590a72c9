import { describe, expect, it } from 'vitest';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { type Happening, modelOf, spinUp } from '../../support/simulatedWatch.ts';
import { confirmed, probabilitySum, watched } from '../../support/watched.ts';

const NU = 3.123456789;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -2e-14, epochMjd: 60_000 });
const QUIET = { phaseWalk: 0, frequencyWalk: 1e-15, torqueWalk: 0 };

/** ν rises evenly over `durationDays` and keeps what it has gained. */
function slowRise(atDays: number, durationDays: number, relativeSize: number): Happening {
  return (t) => {
    const since = Math.max(0, t - atDays);
    const rising = Math.min(since, durationDays);
    return -relativeSize * NU * 86_400 * (rising ** 2 / (2 * durationDays) + since - rising);
  };
}

/** A glitch of which the share `q` decays: Δν (1 − q) t + Δν q τ (1 − e^(−t/τ)), as in Yu et al. 2013, MNRAS 429, 688. */
function recovering(atDays: number, relativeSize: number, q: number, timescaleDays: number): Happening {
  return (t) => {
    const since = Math.max(0, t - atDays);
    const decayed = q * timescaleDays * (1 - Math.exp(-since / timescaleDays));
    return -relativeSize * NU * 86_400 * ((1 - q) * since + decayed);
  };
}

function weekly(seed: number, happening: Happening, count = 80) {
  const days = observingDays(count, 7, 0.6, dice(seed));
  return watched(MODEL, seed, { days, walks: QUIET, uncertaintyUs: 50, happening });
}

describe('a slow spin-up', () => {
  it('is one event with its whole Δν and its duration', () => {
    const events = confirmed(weekly(1, slowRise(300, 60, 2e-8)));
    expect(events.map((e) => e.explanation)).toEqual(['slow spin-up']);
    const [event] = events;
    expect(event!.deltaNuOverNu! / 2e-8).toBeCloseTo(1, 1);
    expect(event!.riseDays!).toBeGreaterThan(30);
    expect(event!.riseDays!).toBeLessThan(100);
    expect(event!.explanations['slow spin-up']!).toBeGreaterThan(0.5);
    expect(probabilitySum(event!)).toBeCloseTo(1, 9);
  });

  it('is not what a glitch is called', () => {
    const [event] = confirmed(weekly(2, spinUp(NU, 300, 2e-8)));
    expect(event!.explanation).toBe('glitch');
    expect(event!.explanations['slow spin-up']!).toBeLessThan(0.1);
    expect(event!.riseDays ?? null).toBeNull();
  });
});

describe('one glitch is one event', () => {
  it.each([
    [3, 7e-8, 0.09, 48],
    [4, 1e-6, 0.2, 15],
    [5, 1e-8, 0.7, 110],
  ])('whatever its recovery (seed %i, Δν/ν = %f, Q = %f, τ = %i d)', (seed, size, q, timescaleDays) => {
    const { events } = weekly(seed, recovering(300, size, q, timescaleDays));
    expect(events.filter((e) => e.state === 'confirmed').map((e) => e.explanation)).toEqual(['glitch']);
  });
});

describe('the probabilities of an event', () => {
  it('name everything that was weighed, and sum to 1', () => {
    const [event] = confirmed(weekly(6, spinUp(NU, 300, 5e-9)));
    expect(probabilitySum(event!)).toBeCloseTo(1, 9);
    expect(Object.keys(event!.explanations)).toEqual(
      expect.arrayContaining([
        'glitch',
        'spin-down glitch',
        'slow spin-up',
        'spin-down-rate change',
        'clock step',
        'bad arrival',
        'bad session',
        'dispersion step',
        'lost count',
        'wandering',
      ]),
    );
    for (const share of Object.values(event!.explanations)) expect(share).toBeGreaterThanOrEqual(0);
  });
});
