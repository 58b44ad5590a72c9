import { describe, expect, it } from 'vitest';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, spinUp } from '../../support/simulatedWatch.ts';
import { confirmed, probabilitySum, watched } from '../../support/watched.ts';

const NU = 4.291;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -4e-13, epochMjd: 58_000 });
const QUIET = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0 };
const GAP_AFTER = 45;

/** Weekly, with one long gap. */
function daysWithGap(seed: number, gapDays: number): number[] {
  return observingDays(90, 7, 0.6, dice(seed)).map((day, i) => (i >= GAP_AFTER ? day + gapDays : day));
}

/** A walk in frequency that moves the phase by `turns` (rms) over `days`. */
function walkOf(turns: number, days: number) {
  return { phaseWalk: 0, frequencyWalk: (3 * turns ** 2) / days ** 3, torqueWalk: 0 };
}

describe('a count that no prediction can keep', () => {
  it.each([
    [1, 120, 3],
    [7, 250, 5],
    [3, 400, 3],
  ])(
    'is one report, and is found again (seed %i, gap of %i days, walk of %i turns over it)',
    (seed, gapDays, turns) => {
      const days = daysWithGap(seed, gapDays);
      const result = watched(MODEL, seed, { days, walks: walkOf(turns, gapDays), uncertaintyUs: 60 });
      const events = confirmed(result);
      expect(events.map((e) => e.explanation)).toEqual(['lost count']);
      const [event] = events;
      expect(event!.epochMjd - 58_000).toBeGreaterThan(days[GAP_AFTER - 1]!);
      expect(event!.epochMjd - 58_000).toBeLessThan(days[GAP_AFTER]!);
      expect(event!.deltaNuHz).toBeNull();
      expect(probabilitySum(event!)).toBeCloseTo(1, 9);
      expect(result.lockedAt[GAP_AFTER - 1]).toBe(true);
      expect(result.lockedAt[GAP_AFTER]).toBe(false);
      expect(result.locked).toBe(true);
      expect(result.lockedAt.filter((locked) => !locked).length).toBeLessThan(30);
    },
  );

  it('is kept over a gap that the noise allows', () => {
    const result = watched(MODEL, 4, { days: daysWithGap(4, 150), walks: walkOf(0.02, 150), uncertaintyUs: 60 });
    expect(confirmed(result)).toEqual([]);
    expect(result.lockedAt.slice(20).every((locked) => locked)).toBe(true);
  });

  it('goes on to watch after the loss: a later glitch is found with its size', () => {
    const days = daysWithGap(5, 300);
    const at = days[75]! - 3;
    const programme = { days, walks: walkOf(3, 300), uncertaintyUs: 60, happening: spinUp(NU, at, 1e-6) };
    const events = confirmed(watched(MODEL, 5, programme));
    expect(events.map((e) => e.explanation)).toEqual(['lost count', 'glitch']);
    expect(events[1]!.deltaNuOverNu! / 1e-6).toBeCloseTo(1, 1);
  });

  it.each([11, 12, 13])(
    'is not the name of a glitch of 2e-6 in a gap of 200 days of a quiet pulsar, seed %i',
    (seed) => {
      const days = daysWithGap(seed, 200);
      const happening = spinUp(NU, days[GAP_AFTER]! - 90, 2e-6);
      const events = confirmed(watched(MODEL, seed, { days, walks: QUIET, uncertaintyUs: 60, happening }));
      expect(events.map((e) => e.explanation)).toEqual(['glitch']);
      const sizes = [events[0]!.deltaNuOverNu!, ...events[0]!.aliases.map((a) => a.deltaNuHz / NU)];
      expect(Math.min(...sizes.map((size) => Math.abs(size / 2e-6 - 1)))).toBeLessThan(0.01);
    },
  );
});

describe('a poor start model', () => {
  it.each([
    ['off by 1e-7 of ν', 21, (t: number) => 1e-7 * NU * 86_400 * t],
    ['off by -1e-7 of ν', 22, (t: number) => -1e-7 * NU * 86_400 * t],
    ['off by a third of a turn over the first year', 23, (t: number) => 0.33 * (t / 182.6 - 1) ** 2],
  ])('%s locks and makes no event', (_what, seed, happening) => {
    const days = observingDays(90, 7, 0.6, dice(seed));
    const result = watched(MODEL, seed, { days, walks: QUIET, uncertaintyUs: 60, happening });
    expect(result.locked).toBe(true);
    expect(confirmed(result)).toEqual([]);
    expect(result.lockedAt.filter((locked) => !locked).length).toBeLessThan(30);
  });
});
