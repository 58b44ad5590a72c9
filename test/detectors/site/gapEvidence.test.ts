import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type PulsarTimes, siteSteps } from '../../../detectors/index.ts';
import { witnessOf } from '../../../detectors/site/candidates.ts';
import { commonStep } from '../../../detectors/site/commonStep.ts';
import { EvidenceLog } from '../../../detectors/site/evidenceLog.ts';
import type { GapEvidence } from '../../../detectors/site/gapEvidence.ts';
import { dice, observingDays, simulateWalk } from '../../support/simulatedPulsar.ts';

const STEP_DAY = 60;
const SIGMA_TURNS = 1e-4;
const WALKS = { phaseWalk: 1e-10, frequencyWalk: 1e-12, torqueWalk: 1e-17 };

/** One pulsar that wanders, with a step in phase that no session shows for sure. */
function wandering(seed: number, stepTurns: number): PulsarTimes {
  const random = dice(7919 * seed);
  const days = observingDays(60, 1.7, 0.3, random);
  const walk = simulateWalk(days, WALKS, random);
  const sessions = days.map((tDays, i) => ({
    siteMjd: 60_000 + tDays,
    tDays,
    deviationTurns: walk[i]! + SIGMA_TURNS * random.normal() + (tDays > STEP_DAY ? stepTurns : 0),
    varianceTurns2: SIGMA_TURNS ** 2,
    place: 0,
    freed: false,
  }));
  return { pulsar: 'KR 0417+31', frequencyHz: 2, walks: WALKS, places: ['kestrel ridge|main'], sessions };
}

function gapsOf(times: PulsarTimes): GapEvidence[] {
  const log = new EvidenceLog(times.places.map(() => true));
  log.take(times, new Float64Array(times.sessions.length));
  return log.gaps(-Infinity, Infinity);
}

const stepGap = (times: PulsarTimes) =>
  gapsOf(times).find(({ afterMjd, beforeMjd }) => afterMjd < 60_000 + STEP_DAY && beforeMjd > 60_000 + STEP_DAY)!;

describe('what a pulsar says of a gap', () => {
  it('moves by all of a step, be it seen in one session or in all of twenty days', () => {
    // A weighted least-squares estimate is linear, and without bias (Gauss and Markov).
    for (let seed = 1; seed <= 5; seed++) {
      const step = 0.5 * SIGMA_TURNS;
      const [quiet, stepped] = [stepGap(wandering(seed, 0)), stepGap(wandering(seed, step))];
      expect((stepped.first.turns - quiet.first.turns) / step).toBeCloseTo(1, 9);
      expect((stepped.all.turns - quiet.all.turns) / step).toBeCloseTo(1, 9);
      expect(stepped.all.variance).toBeLessThan(stepped.first.variance);
    }
  });

  it('is wrong by as much as it says', () => {
    const pulls = Array.from({ length: 200 }, (_, seed) => {
      const { turns, variance } = stepGap(wandering(100 + seed, 0)).all;
      return turns / Math.sqrt(variance);
    });
    const rms = Math.sqrt(pulls.reduce((sum, pull) => sum + pull * pull, 0) / pulls.length);
    // The error of an rms of 200 is 5 %.
    expect(rms).toBeGreaterThan(0.85);
    expect(rms).toBeLessThan(1.15);
  });
});

const between = (min: number, max: number) => fc.double({ min, max, noNaN: true });
const powerOfTen = (min: number, max: number) => between(min, max).map((exponent) => 10 ** exponent);
const strength = (min: number, max: number) => fc.oneof(fc.constant(0), powerOfTen(min, max));

/** Sessions in the order of the barycentre, as they are kept; the clock of the site may show another. */
const hostilePulsar = fc
  .record({
    frequencyHz: powerOfTen(-3, 3),
    walks: fc.record({
      phaseWalk: strength(-20, -8),
      frequencyWalk: strength(-25, -10),
      torqueWalk: strength(-30, -14),
    }),
    sessions: fc.array(
      fc.record({
        tDays: fc.oneof(fc.integer({ min: 0, max: 40 }), between(0, 40)),
        clockOffDays: fc.oneof(fc.constant(0), between(-0.5, 0.5)),
        deviationTurns: fc.oneof({ weight: 6, arbitrary: between(-1e-3, 1e-3) }, between(-1, 1), between(-1e6, 1e6)),
        varianceTurns2: fc.oneof({ weight: 6, arbitrary: powerOfTen(-14, -5) }, powerOfTen(-300, 6)),
        place: fc.nat(2),
        freed: fc.boolean(),
      }),
      { minLength: 1, maxLength: 20 },
    ),
  })
  .map(
    ({ sessions, ...rest }): PulsarTimes => ({
      ...rest,
      pulsar: '',
      places: ['annex|main', 'annex|other', 'kestrel ridge|main'],
      sessions: sessions
        .map(({ clockOffDays, ...session }) => ({ ...session, siteMjd: 60_000 + session.tDays + clockOffDays }))
        .sort((a, b) => a.tDays - b.tDays),
    }),
  );

describe('hostile nights', () => {
  it('end in finite numbers: one pulsar, equal times, sessions whose clock goes backwards, errors beyond all bounds', () => {
    const night = fc.array(hostilePulsar, { minLength: 1, maxLength: 4 });
    fc.assert(
      fc.property(night, (pulsars) => {
        const all = pulsars.map((times, i) => ({ ...times, pulsar: `KR ${i}` }));
        const gaps = all.flatMap(gapsOf);
        for (const gap of gaps) {
          expect(gap.beforeMjd).toBeGreaterThan(gap.afterMjd);
          for (const phase of [gap.first, gap.all]) {
            const { logBayesFactor, stepS, uncertaintyS } = commonStep([
              witnessOf(gaps[0]!, gaps[0]!.all),
              witnessOf(gap, phase),
            ]);
            expect([phase.turns, phase.variance, logBayesFactor, stepS, uncertaintyS].every(Number.isFinite)).toBe(
              true,
            );
          }
        }
        for (const { stepUs, uncertaintyUs, logOdds } of siteSteps(all))
          expect([stepUs, uncertaintyUs, logOdds].every(Number.isFinite)).toBe(true);
      }),
      { numRuns: 100, seed: 3 },
    );
  });
});
