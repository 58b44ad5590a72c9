import { describe, expect, it } from 'vitest';
import { advance, detectorSettings, type PulsarReport, report, startWatch } from '../../../detectors/index.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, type Programme, simulateTimedArrivals, spinUp } from '../../support/simulatedWatch.ts';

const NU = 3.123456789;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -2e-14, epochMjd: 60_000 });
const QUIET = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };

function watched(
  seed: number,
  programme: Partial<Programme> & { readonly count?: number; readonly cadence?: number },
): PulsarReport {
  const random = dice(seed);
  const days = programme.days ?? observingDays(programme.count ?? 90, programme.cadence ?? 3, 0.6, random);
  const arrivals = simulateTimedArrivals(MODEL, { walks: QUIET, uncertaintyUs: 60, ...programme, days }, random);
  const watch = startWatch(MODEL, detectorSettings(1, 10));
  for (const arrival of arrivals) advance(watch, arrival);
  return report(watch);
}

const confirmed = (r: PulsarReport) => r.events.filter((e) => e.state === 'confirmed');

describe('what the detector says of one pulsar', () => {
  it.each([1, 2, 3, 4, 5, 6])('stays silent on a quiet pulsar, seed %i', (seed) => {
    const result = watched(seed, { count: 150 });
    expect(result.locked).toBe(true);
    expect(confirmed(result)).toEqual([]);
  });

  it.each([
    [3e-9, 11],
    [3e-8, 12],
    [1e-6, 13],
  ])('confirms one glitch of Δν/ν = %f with the size inside its 95 %% interval', (size, seed) => {
    const result = watched(seed, { happening: spinUp(NU, 180, size) });
    const events = confirmed(result);
    expect(events.map((e) => e.explanation)).toEqual(['glitch']);
    const [event] = events;
    expect(event!.deltaNuHzInterval95![0]).toBeLessThan(size * NU);
    expect(event!.deltaNuHzInterval95![1]).toBeGreaterThan(size * NU);
    // A small step's epoch is known to some days only.
    expect(Math.abs(event!.epochMjd - 60_180)).toBeLessThan(size < 1e-8 ? 30 : 3);
    expect(event!.confirmedAtMjd!).toBeGreaterThan(60_180);
    expect(event!.explanations['glitch']!).toBeGreaterThan(0.99);
    expect(result.pictures.get(event!.id)!.points.length).toBeGreaterThan(20);
  });

  it('calls a step of the other sign a spin-down glitch', () => {
    const events = confirmed(watched(21, { happening: spinUp(NU, 180, -5e-8) }));
    expect(events.map((e) => e.explanation)).toEqual(['spin-down glitch']);
    expect(events[0]!.deltaNuHz!).toBeLessThan(0);
  });

  it('tells a clock step from a glitch and states it in µs', () => {
    const stepUs = 600;
    const events = confirmed(watched(31, { happening: (t) => (t > 180 ? stepUs * 1e-6 * NU : 0) }));
    expect(events.map((e) => e.explanation)).toEqual(['clock step']);
    const [low, high] = events[0]!.timeStepUsInterval68!;
    expect(Math.abs(events[0]!.timeStepUs! - stepUs)).toBeLessThan(2.5 * (high - low));
  });

  it('tells a dispersion step by its f⁻² law', () => {
    // 0.06 pc cm⁻³ by the cold-plasma law with K = 1/2.41e-4 s MHz² (Manchester & Taylor 1972; value as in the design).
    const delayS = (mhz: number) => 0.06 / 2.41e-4 / mhz ** 2;
    const events = confirmed(
      watched(41, {
        bandsMhz: [700, 1400],
        happening: (t, { frequencyMhz }) => (t > 180 ? delayS(frequencyMhz) * NU : 0),
      }),
    );
    expect(events.map((e) => e.explanation)).toEqual(['dispersion step']);
    expect(events[0]!.timeStepUs! / (delayS(1400) * 1e6)).toBeCloseTo(1, 0);
  });

  it('sets one bad arrival aside and makes no event of it', () => {
    const result = watched(51, { happening: (_t, { index }) => (index === 60 ? 0.08 : 0) });
    expect(confirmed(result)).toEqual([]);
    expect(result.arrivals[60]!.fate).toBe('set aside');
    expect(result.arrivals.filter((a) => a.fate === 'set aside')).toHaveLength(1);
  });

  it('calls a session of bad arrivals a bad session', () => {
    const random = dice(61);
    const days = observingDays(70, 3, 0.6, random).flatMap((d) => [d, d + 0.01, d + 0.02]);
    const bad = new Set([120, 121, 122]);
    const events = confirmed(watched(62, { days, happening: (_t, { index }) => (bad.has(index) ? 0.06 : 0) }));
    expect(events.map((e) => e.explanation)).toEqual(['bad session']);
    // Three outliers of their own, two in a hundred each, or one bad session of which each further arrival is bad by four in five.
    expect(events[0]!.explanations['bad arrival']! / events[0]!.explanations['bad session']!).toBeCloseTo(
      0.025 ** 2,
      6,
    );
    expect(Object.values(events[0]!.explanations).reduce((sum, share) => sum + share, 0)).toBeCloseTo(1, 9);
  });

  it('follows a wandering pulsar without an alert', () => {
    const walks = { phaseWalk: 0, frequencyWalk: 3e-11, torqueWalk: 1e-16 };
    for (const seed of [71, 72, 73]) expect(confirmed(watched(seed, { walks, count: 160 }))).toEqual([]);
  });

  it('finds a step of many turns per gap by the circular search', () => {
    // 2e-5 of ν is 5.4 turns a day: no count survives the gap.
    const result = watched(81, { happening: spinUp(NU, 180, 2e-5), cadence: 5 });
    const [event] = confirmed(result);
    const sizes = [event!.deltaNuHz!, ...event!.aliases.map((a) => a.deltaNuHz)];
    expect(Math.min(...sizes.map((s) => Math.abs(s / (2e-5 * NU) - 1)))).toBeLessThan(0.01);
  });

  it('corrects a start model that is far off before it decides anything', () => {
    const wrong = (t: number) => -3e-6 * NU * 86_400 * t;
    const result = watched(85, { happening: wrong });
    expect(result.locked).toBe(true);
    expect(confirmed(result)).toEqual([]);
    expect(result.arrivals.slice(30).every((a) => a.fate === 'used')).toBe(true);
  });

  it('is the same function of the log however it is called', () => {
    const once = watched(91, { happening: spinUp(NU, 180, 3e-8) });
    const again = watched(91, { happening: spinUp(NU, 180, 3e-8) });
    expect(JSON.stringify(again)).toBe(JSON.stringify(once));
  });
});

describe('pulse numbers that come with the arrivals', () => {
  /** Every 40 days: no count survives a step of 2e-6 without the numbers. */
  const sparse = (seed: number, size: number, renumbered: (index: number) => number): PulsarReport => {
    const random = dice(seed);
    const days = observingDays(40, 40, 0.3, random);
    const happening = spinUp(NU, 1000, size);
    const arrivals = simulateTimedArrivals(MODEL, { days, walks: QUIET, uncertaintyUs: 60, happening }, random);
    const watch = startWatch(MODEL, detectorSettings(1, 10));
    arrivals.forEach((arrival, index) => {
      const seen = watch.phaseAt(arrival.tdb);
      const moved = happening(days[index]!, { frequencyMhz: 1400, index });
      const pulseNumber = Math.round(seen.pulseNumber + seen.deviationTurns - moved) + renumbered(index);
      advance(watch, { ...arrival, pulseNumber });
    });
    return report(watch);
  };

  it('keep the count over a large step between sparse sessions', () => {
    const events = confirmed(sparse(101, 2e-6, () => 500));
    expect(events.map((e) => e.explanation)).toEqual(['glitch']);
    expect(events[0]!.deltaNuOverNu! / 2e-6).toBeCloseTo(1, 3);
    expect(events[0]!.aliases).toEqual([]);
  });

  it('may begin anew without an event', () => {
    const result = sparse(102, 0, (index) => (index < 25 ? 0 : -12_345));
    expect(confirmed(result)).toEqual([]);
    expect(result.arrivals.every((a) => a.fate === 'used')).toBe(true);
  });
});
