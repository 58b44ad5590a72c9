import { describe, expect, it } from 'vitest';
import { advance, detectorSettings, type PulsarReport, report, startWatch } from '../../../detectors/index.ts';
import type { DeclaredOffset } from '../../../detectors/spin/pulsarModel.ts';
import { addSeconds } from '../../../detectors/time/mjd.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { modelOf, simulateTimedArrivals, spinUp } from '../../support/simulatedWatch.ts';

// A new receiver comes into use, and how late its times are is known to nobody: that is no event, and hides none.

const NU = 3.123456789;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -2e-14, epochMjd: 60_000 });
const SPAN_DAYS = 270;
const NEW_FROM_DAY = 180;

interface Change {
  readonly seed: number;
  /** What the new receiver's times are late by. */
  readonly offsetUs: number;
  /** Whether the old one is used on every second day still. */
  readonly oldStays: boolean;
  readonly glitch?: { readonly day: number; readonly size: number };
  readonly declared?: readonly DeclaredOffset[];
}

function watched({ seed, offsetUs, oldStays, glitch, declared = [] }: Change): PulsarReport {
  const random = dice(seed);
  const days = observingDays(SPAN_DAYS / 3, 3, 0.6, random);
  const walks = { phaseWalk: 0, frequencyWalk: 1e-14, torqueWalk: 0 };
  const happening = glitch === undefined ? () => 0 : spinUp(NU, glitch.day, glitch.size);
  const watch = startWatch({ ...MODEL, receivers: declared }, detectorSettings(1, 10));
  simulateTimedArrivals(MODEL, { days, walks, uncertaintyUs: 60, happening }, random).forEach((arrival, i) => {
    const isNew = days[i]! > NEW_FROM_DAY && !(oldStays && i % 2 === 0);
    advance(watch, isNew ? { ...arrival, receiver: 'new', tdb: addSeconds(arrival.tdb, offsetUs * 1e-6) } : arrival);
  });
  return report(watch);
}

const confirmed = (r: PulsarReport) => r.events.filter((e) => e.state === 'confirmed');

describe('a receiver that was never seen before', () => {
  // Up to 100 ms: a third of a turn.
  const offsets = [-2000, 350, 5000, 40_000, -100_000];

  it.each(offsets)('makes no event with an offset of %d µs beside the old one', (offsetUs) => {
    const result = watched({ seed: 1, offsetUs, oldStays: true });
    expect(result.events).toEqual([]);
    expect(result.arrivals.every(({ fate }) => fate === 'used')).toBe(true);
  });

  it.each(offsets)('makes no event with an offset of %d µs in place of the old one', (offsetUs) => {
    const result = watched({ seed: 2, offsetUs, oldStays: false });
    expect(result.events).toEqual([]);
    expect(result.arrivals.every(({ fate }) => fate === 'used')).toBe(true);
  });

  it.each([
    [true, 3],
    [false, 4],
  ])('hides no glitch of the same weeks (the old receiver stays in use: %s)', (oldStays, seed) => {
    const glitch = { day: NEW_FROM_DAY + 12, size: 3e-8 };
    const events = confirmed(watched({ seed, offsetUs: 5000, oldStays, glitch }));
    expect(events.map(({ explanation }) => explanation)).toEqual(['glitch']);
    const [low, high] = events[0]!.deltaNuHzInterval95!;
    expect(low).toBeLessThan(glitch.size * NU);
    expect(high).toBeGreaterThan(glitch.size * NU);
    expect(Math.abs(events[0]!.epochMjd - (60_000 + glitch.day))).toBeLessThan(3);
  });

  it('hides no glitch of the very gap in which it replaces the old one', () => {
    const glitch = { day: NEW_FROM_DAY, size: 1e-7 };
    const events = confirmed(watched({ seed: 5, offsetUs: -2000, oldStays: false, glitch }));
    expect(events.map(({ explanation }) => explanation)).toEqual(['glitch']);
    // The jump in phase may be the receiver's: the size rests on the new receiver's own arrivals.
    const [low, high] = events[0]!.deltaNuHzInterval95!;
    expect(low).toBeLessThan(glitch.size * NU);
    expect(high).toBeGreaterThan(glitch.size * NU);
  });
});

describe('a declared offset', () => {
  const offsetUs = 5000;
  const declared = [{ receiver: 'new', offsetUs, uncertaintyUs: 20 }];
  const change = { seed: 6, offsetUs, oldStays: false };
  const jumpUs = ({ arrivals }: PulsarReport) => {
    const at = arrivals.findIndex(({ key }) => Number(key) > NEW_FROM_DAY / 3);
    const mean = (some: typeof arrivals) => some.reduce((sum, a) => sum + a.deviationTurns, 0) / some.length;
    return ((mean(arrivals.slice(at, at + 8)) - mean(arrivals.slice(at - 8, at))) / NU) * 1e6;
  };

  it('is taken off the deviations', () => {
    // Eight arrivals of 60 µs on either side, and a pulsar that hardly wanders.
    expect(jumpUs(watched(change))).toBeGreaterThan(offsetUs - 200);
    expect(Math.abs(jumpUs(watched({ ...change, declared })))).toBeLessThan(200);
    expect(watched({ ...change, declared }).events).toEqual([]);
  });

  it('leaves a step that it does not explain to be found', () => {
    const wrong = [{ receiver: 'new', offsetUs: 2000, uncertaintyUs: 20 }];
    const events = confirmed(watched({ ...change, declared: wrong }));
    expect(events.map(({ explanation }) => explanation)).toEqual(['clock step']);
    const [low, high] = events[0]!.timeStepUsInterval68!;
    expect(Math.abs(events[0]!.timeStepUs! - 3000)).toBeLessThan(2.5 * (high - low));
  });

  it('holds at its site alone where it names one, and stands above one that does not', () => {
    const elsewhere = [{ receiver: 'new', site: 'kestrel annex', offsetUs: 9000, uncertaintyUs: 20 }];
    const here = [{ receiver: 'new', site: 'kestrel ridge', offsetUs, uncertaintyUs: 20 }];
    const everywhere = [{ receiver: 'new', offsetUs: 9000, uncertaintyUs: 20 }];
    const one = JSON.stringify(watched({ ...change, declared }).arrivals);
    expect(JSON.stringify(watched({ ...change, declared: [...everywhere, ...here] }).arrivals)).toBe(one);
    expect(JSON.stringify(watched({ ...change, declared: elsewhere }))).toBe(JSON.stringify(watched(change)));
  });
});
