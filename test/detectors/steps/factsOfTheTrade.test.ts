/** What every timing group knows of pulsars (common practice, no source), as the detector sees it. */
import { describe, expect, it } from 'vitest';
import { phaseEvaluator } from '../../../detectors/spin/spinDownModel.ts';
import { normalMjd } from '../../../detectors/time/mjd.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, spinUp } from '../../support/simulatedWatch.ts';
import { confirmed, watched } from '../../support/watched.ts';

const EPOCH_MJD = 60_000;
const QUIET = { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0 };

function pulsar(frequencyHz: number, frequencyDerivativeHzPerS: number) {
  return modelOf({ frequencyHz: frequencyHz.toFixed(12), frequencyDerivativeHzPerS, epochMjd: EPOCH_MJD });
}

/** Seconds, from the count of turns over ten days about `tDays`. */
function periodAt(model: ReturnType<typeof pulsar>, tDays: number): number {
  const phaseAt = phaseEvaluator(model);
  const turns = (t: number) => {
    const { pulseNumber, deviationTurns } = phaseAt(normalMjd(EPOCH_MJD, t));
    return { pulseNumber, deviationTurns };
  };
  const [a, b] = [turns(tDays - 5), turns(tDays + 5)];
  return (10 * 86_400) / (b.pulseNumber - a.pulseNumber + b.deviationTurns - a.deviationTurns);
}

describe('facts of the trade', () => {
  it('the period of an isolated pulsar rises steadily as it radiates', () => {
    const model = pulsar(3.1, -4e-13);
    const periods = [0, 500, 1000, 1500, 2000].map((t) => periodAt(model, t));
    const rises = periods.slice(1).map((p, i) => p - periods[i]!);
    for (const rise of rises) expect(rise).toBeGreaterThan(0);
    // Ṗ = −ν̇/ν²
    expect(rises[0]! / (500 * 86_400) / (4e-13 / 3.1 ** 2)).toBeCloseTo(1, 1);
  });

  it('at a glitch the period drops at once by a tiny fraction, and the slow-down goes on', () => {
    const before = pulsar(3.1, -4e-13);
    const model = {
      ...before,
      glitches: [
        {
          epochTdb: { day: EPOCH_MJD + 1000, fraction: 0 },
          phaseTurns: 0,
          frequencyStepHz: 1e-6 * 3.1,
          frequencyDerivativeStepHzPerS: 0,
          recoveries: [],
        },
      ],
    };
    expect(periodAt(model, 1010) / periodAt(before, 1010) - 1).toBeCloseTo(-1e-6, 9);
    expect(periodAt(model, 1500)).toBeGreaterThan(periodAt(model, 1010));
  });

  it('a spin-up shows as a downward ramp of the deviation', () => {
    const days = observingDays(80, 7, 0.6, dice(1));
    const model = pulsar(3.1, -2e-14);
    const result = watched(model, 1, { days, walks: QUIET, uncertaintyUs: 50, happening: spinUp(3.1, 300, 3e-8) });
    const after = result.arrivals.filter((_, i) => days[i]! > 320);
    for (let i = 1; i < after.length; i++) expect(after[i]!.deviationTurns).toBeLessThan(after[i - 1]!.deviationTurns);
    expect(confirmed(result)[0]!.deltaNuHz!).toBeGreaterThan(0);
  });

  it('an accreting pulsar spins up: its model is taken, and its steady spin-up is no event', () => {
    const days = observingDays(60, 7, 0.6, dice(2));
    const result = watched(pulsar(0.13, 3e-13), 2, { days, walks: QUIET, uncertaintyUs: 5e4 });
    expect(result.locked).toBe(true);
    expect(confirmed(result)).toEqual([]);
  });

  it.each([
    ['1.4 ms', 1 / 1.4e-3, -3e-16, 2, 3e-9],
    ['33 ms', 30, -3.7e-10, 50, 3e-8],
    ['12 s', 1 / 12, -1e-15, 5e3, 3e-6],
  ])(
    'periods run from about a millisecond to seconds: a glitch is found at %s',
    (_p, nu, nuDot, uncertaintyUs, size) => {
      const days = observingDays(80, 7, 0.6, dice(3));
      const result = watched(pulsar(nu, nuDot), 3, {
        days,
        walks: QUIET,
        uncertaintyUs,
        happening: spinUp(nu, 300, size),
      });
      const events = confirmed(result);
      expect(events.map((e) => e.explanation)).toEqual(['glitch']);
      expect(events[0]!.deltaNuOverNu! / size).toBeCloseTo(1, 1);
    },
  );
});
