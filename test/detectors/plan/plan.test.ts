import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import type { PulsarEvent } from '../../../detectors/index.ts';
import { report } from '../../../detectors/index.ts';
import { normalTail } from '../../../detectors/math/normal.ts';
import { nextUsualTime, nullAhead, SIDEREAL_DAY } from '../../../detectors/plan/ahead.ts';
import { expectedLargest, planForAliases } from '../../../detectors/plan/aliasPlan.ts';
import { COUNT_SPREAD_TURNS, countSafety } from '../../../detectors/plan/countSafety.ts';
import { openPlan, planFor } from '../../../detectors/plan/plan.ts';
import { derivatives } from '../../../detectors/plan/recoveryPlan.ts';
import { every, followed, QUIET_FREQUENCY_HZ } from '../../support/quietWatch.ts';
import { glitchTurns } from '../../support/simulatedGlitch.ts';
import { spinUp } from '../../support/simulatedWatch.ts';

const LAST_DAY = 4 * 59;
const NOW = 58_000 + LAST_DAY + 0.5;
const quiet = followed({ days: every(4, 60) });

describe('the chance to name the right size', () => {
  test('of two equal ones d apart is Φ(d / 2σ)', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 0.02, max: 0.4, noNaN: true }),
        fc.double({ min: 0.01, max: 0.1, noNaN: true }),
        (apart, sigma) => {
          const expected = normalTail(-apart / (2 * sigma));
          // The far ends of both may meet around the turn.
          const around = normalTail((1 - apart) / (2 * sigma));
          expect(Math.abs(expectedLargest([0.5, 0.5], [0, apart], sigma) - expected)).toBeLessThan(0.003 + around);
        },
      ),
    );
  });

  test('never falls below what is known today', () => {
    expect(expectedLargest([0.7, 0.3], [0, 0.2], 5)).toBeCloseTo(0.7, 6);
  });
});

describe('the plan', () => {
  const aliased = (watch: typeof quiet): PulsarEvent => {
    const order = 1 / (86_400 * SIDEREAL_DAY);
    const event = report(watch).events[0];
    return {
      ...event!,
      aliases: [
        { deltaNuHz: 1e-7, probability: 0.6 },
        { deltaNuHz: 1e-7 + order, probability: 0.4 },
      ],
    };
  };
  const size = 5e-7;
  const struck = followed({ days: every(4, 60), happening: spinUp(QUIET_FREQUENCY_HZ, 201, size) });

  test('tells sidereal aliases apart by two arrivals hours apart, or by one away from the usual time', () => {
    const { options, probabilityNow } = planForAliases(struck, aliased(struck), NOW);
    expect(probabilityNow).toBe(0.6);
    const [best] = options;
    expect(best!.expectedProbability).toBeGreaterThan(0.99);
    const spread = Math.max(...best!.timesMjd) - Math.min(...best!.timesMjd);
    expect(spread > 0.05 || Math.abs(best!.hoursFromUsual[0]!) >= 1).toBe(true);
    expect(best!.separations[0]!.sigmas).toBeGreaterThan(5);
  });

  test('of a glitch says what each night buys, and more nights buy more', () => {
    const plan = planFor(struck, report(struck).events, NOW);
    const { schedules, nights, now, recommended } = plan.recovery!;
    const q = (name: string) => schedules.find((s) => s.name === name)!.widths.q!;
    expect(q('daily')).toBeLessThan(q('every 3 days'));
    expect(q('every 3 days')).toBeLessThan(q('every 10 days'));
    expect(q('every 10 days')).toBeLessThan(now.q ?? Number.POSITIVE_INFINITY);
    expect(schedules.map((s) => s.name)).toContain(recommended);
    for (const [i, night] of nights.entries())
      if (i > 0) expect(night.widths.deltaNuHz!).toBeLessThanOrEqual(nights[i - 1]!.widths.deltaNuHz!);
  });

  test('for the record is that of the last arrival, and there is none where nothing is open', () => {
    const { events } = report(struck);
    const { cadences: _, ...atLastArrival } = planFor(struck, events, Number.NEGATIVE_INFINITY);
    expect(openPlan(struck, events)).toEqual(atLastArrival);
    expect(atLastArrival.asOfMjd).toBe(atLastArrival.lastArrivalMjd);
    expect(openPlan(quiet, report(quiet).events)).toBeNull();
  });

  test('linearises the published glitch model', () => {
    fc.assert(
      fc.property(
        fc.double({ min: 1, max: 300, noNaN: true }),
        fc.double({ min: 2, max: 200, noNaN: true }),
        (tDays, timescaleDays) => {
          const [q, nu] = [0.2, 1e-6];
          const glitch = (tau: number, persistent: number, dot: number, decaying: number) =>
            glitchTurns(
              {
                epochDays: 0,
                persistentNuHz: persistent,
                persistentNuDotHzPerS: dot,
                decayingNuHz: decaying,
                timescaleDays: tau,
              },
              tDays,
            );
          const model = { epochDays: 0, timescaleDays, rate: nu * 86_400, q };
          const [persistent, dot, decaying, tau] = derivatives(model, tDays);
          const step = 1e-4 * timescaleDays;
          const slope =
            (glitch(timescaleDays + step, 0, 0, q * nu) - glitch(timescaleDays - step, 0, 0, q * nu)) / (2 * step);
          expect(persistent! * nu * 86_400).toBeCloseTo(glitch(timescaleDays, nu, 0, 0), 9);
          expect(dot! * 1e-15 * 86_400 ** 2).toBeCloseTo(glitch(timescaleDays, 0, 1e-15, 0), 9);
          expect(decaying! * nu * 86_400).toBeCloseTo(glitch(timescaleDays, 0, 0, nu), 9);
          expect(Math.abs(tau! - slope)).toBeLessThan(1e-5 * Math.abs(slope) + 1e-12);
        },
      ),
    );
  });

  test('counts sessions until a suspicion is settled, fewer of them the wider they are spaced', () => {
    // Small enough that the third arrival after it leaves the question open.
    for (const relativeSize of [3e-10, 6e-10, 1e-9, 1.5e-9, 2e-9]) {
      const watch = followed({
        days: every(4, 60).slice(0, 53),
        happening: spinUp(QUIET_FREQUENCY_HZ, 199, relativeSize),
      });
      const { events } = report(watch);
      if (!events.some((e) => e.state === 'suspected')) continue;
      const { suspicion } = planFor(watch, events, 58_000 + 208.5);
      const nightly = suspicion!.options[0]!;
      const weekly = suspicion!.options.at(-1)!;
      expect(nightly.chanceAfter[3]!).toBeGreaterThan(nightly.chanceAfter[0]!);
      expect(weekly.sessions!).toBeLessThanOrEqual(nightly.sessions!);
      return;
    }
    throw new Error('no size was suspected');
  });

  test('keeps the count safe until the prediction spreads over a tenth of a turn', () => {
    const { safeDays } = countSafety(quiet);
    expect(Math.sqrt(nullAhead(quiet, safeDays!).cov[0]!)).toBeCloseTo(COUNT_SPREAD_TURNS, 3);
    const noisy = followed({ days: every(4, 60), torqueWalk: 1e-13 });
    expect(countSafety(noisy).safeDays!).toBeLessThan(safeDays!);
  });

  test('names times at which the pulsar is up as usual', () => {
    const sidereal = followed({ days: every(SIDEREAL_DAY, 40).map((day) => day + 0.3) });
    const next = nextUsualTime(sidereal, 58_100);
    expect(next).toBeGreaterThanOrEqual(58_100);
    expect(next).toBeLessThan(58_101);
    const turns = (next - 58_000.3) / SIDEREAL_DAY;
    expect(Math.abs(turns - Math.round(turns))).toBeLessThan(1e-3);
  });

  test('of a quiet pulsar says what other cadences would show', () => {
    const { cadences, aliases, suspicion, recovery, count } = planFor(quiet, [], NOW);
    expect([aliases, suspicion, recovery]).toEqual([null, null, null]);
    expect(count!.safeDays!).toBeGreaterThan(30);
    expect(cadences.map((c) => c.everyDays)).toEqual([1, 3, 7, 14, 30]);
    const sizes = cadences.map((c) => c.deltaNuOverNu90!);
    expect(sizes[0]!).toBeLessThan(sizes.at(-1)!);
  });

  test('of a pulsar without arrivals is empty', () => {
    const plan = planFor(followed({ days: [] }), [], NOW);
    expect(plan).toMatchObject({ lastArrivalMjd: null, count: null, recovery: null, cadences: [] });
  });
});
