import { describe, expect, it } from 'vitest';
import { withMargin } from '../../../detectors/filter/noiseMargin.ts';
import { noisePrior } from '../../../detectors/filter/noisePrior.ts';
import { leastJointOdds } from '../../../detectors/steps/jointOdds.ts';
import type { PulsarWatch } from '../../../detectors/steps/pulsarWatch.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

/** A record of so many sessions, each of `each` arrivals. */
function watchOf(sessions: number, each = 1): PulsarWatch {
  const seen = Array.from({ length: sessions * each }, (_, i) => ({ session: Math.floor(i / each) }));
  return { line: { seen } } as unknown as PulsarWatch;
}

describe('how much noise may be the better explanation of a glitch', () => {
  const learnedFrom = (sessions: number, each = 1) =>
    leastJointOdds(watchOf(sessions, each), { kind: 'glitch', bestGap: sessions * each });

  it('grows by two nats with every doubling of the sessions before it', () => {
    expect([59, 60, 100, 200, 400, 800, 1600, 100_000].map((n) => learnedFrom(n))).toEqual([
      Number.POSITIVE_INFINITY,
      -0,
      -0,
      -2,
      -4,
      -6,
      -8,
      -8,
    ]);
  });

  it('counts sessions, not arrivals minutes apart', () => {
    expect(learnedFrom(59, 20)).toBe(Number.POSITIVE_INFINITY);
    expect(learnedFrom(200, 20)).toBe(-2);
  });

  it('is nothing for a change of the spin-down rate', () => {
    expect(leastJointOdds(watchOf(400), { kind: 'spin-down-rate change', bestGap: 400 })).toBe(
      Number.POSITIVE_INFINITY,
    );
  });
});

describe('the margin of the noise that decides', () => {
  const arrivals = simulateArrivals(
    observingDays(60, 7, 0.6, dice(4)),
    { phaseWalk: 0, frequencyWalk: 1e-13, torqueWalk: 0 },
    1e-4,
    dice(5),
  );
  const prior = noisePrior(3, -1e-14);
  const learned = { phaseWalk: 1e-12, frequencyWalk: 1e-13, torqueWalk: 1e-18, uncertaintyScale: 1, floorTurns: 3e-5 };
  const learnedFrom = (sessions: number) => withMargin(learned, arrivals, [], prior, sessions);

  it('makes the walks louder after few sessions, by less and less, and not at all after three hundred', () => {
    const few = learnedFrom(60).frequencyWalk;
    expect(few).toBeGreaterThan(learned.frequencyWalk);
    expect(learnedFrom(150).frequencyWalk).toBe(few);
    expect(learnedFrom(225).frequencyWalk).toBeLessThanOrEqual(few);
    expect(learnedFrom(300)).toEqual(learned);
  });
});
