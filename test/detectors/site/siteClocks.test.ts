import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type PulsarTimes, SiteClocks, siteSteps } from '../../../detectors/index.ts';
import { siteSessions } from '../../support/siteSessions.ts';

const FREQUENCIES_HZ = [0.714, 1.93, 3.31, 7.7, 29.9];
const SESSIONS = 130;

/** A clock that steps twice, and is off for one night. */
function lateS(daysIn: number): number {
  const night = daysIn > 69.9 && daysIn < 71 ? 2e-3 : 0;
  return (daysIn > 30 ? 4e-4 : 0) + (daysIn > 95 ? -0.3 : 0) + night;
}

const WHOLE = FREQUENCIES_HZ.map((frequencyHz, i) =>
  siteSessions(
    { name: `KR 000${i}+00`, frequencyHz, uncertaintyUs: 60, seed: 40 + i, lateS, startDays: 0.15 * i },
    SESSIONS,
  ),
);

function cut(times: PulsarTimes, count: number, leftOut: number | null): PulsarTimes {
  return { ...times, sessions: times.sessions.slice(0, count).filter((_, i) => i !== leftOut) };
}

describe('the clocks of sites, judged again as sessions come in', () => {
  it('steps there and back as the sessions were made', () => {
    const steps = siteSteps(WHOLE);
    const made = [400, 2000, -2000, -300_000];
    expect(steps).toHaveLength(made.length);
    for (const [i, { stepUs, uncertaintyUs }] of steps.entries())
      expect(Math.abs(stepUs - made[i]!)).toBeLessThan(4 * uncertaintyUs);
  });

  it('are judged as if all sessions had been there from the first: in any order, with late ones and pulsars that come and go', () => {
    const state = fc.array(
      fc.record({
        count: fc.integer({ min: 0, max: SESSIONS }),
        leftOut: fc.option(fc.integer({ min: 0, max: SESSIONS - 1 })),
      }),
      { minLength: WHOLE.length, maxLength: WHOLE.length },
    );
    fc.assert(
      fc.property(fc.array(state, { minLength: 2, maxLength: 5 }), (states) => {
        const clocks = new SiteClocks();
        for (const one of states) {
          const times = one.flatMap(({ count, leftOut }, i) => (count === 0 ? [] : [cut(WHOLE[i]!, count, leftOut)]));
          expect(clocks.steps(times)).toEqual(siteSteps(times));
        }
      }),
      { numRuns: 12, seed: 9 },
    );
  });

  it('are judged the same night by night', () => {
    const clocks = new SiteClocks();
    for (let night = 20; night <= SESSIONS; night += 3) {
      const times = WHOLE.map((whole, i) => cut(whole, night + (i % 2), null));
      expect(clocks.steps(times)).toEqual(siteSteps(times));
    }
  });
});
