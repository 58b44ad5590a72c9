import { describe, expect, it } from 'vitest';
import { advance, detectorSettings, report, startWatch } from '../../../detectors/index.ts';
import { logRatio } from '../../../detectors/math/logSumExp.ts';
import { dice } from '../../support/simulatedPulsar.ts';
import { type Happening, modelOf, simulateTimedArrivals } from '../../support/simulatedWatch.ts';

const EPOCH = 60_000;
const WALKS = { phaseWalk: 1e-14, frequencyWalk: 1e-15, torqueWalk: 1e-22 };

describe('the weight of an event', () => {
  it('is nothing, not "not a number", where nothing stands against nothing', () => {
    expect(logRatio(-Infinity, -Infinity)).toBe(-Infinity);
    expect(logRatio(-Infinity, -3)).toBe(-Infinity);
    expect(logRatio(-2, -Infinity)).toBe(Infinity);
    expect(logRatio(-2, -3)).toBe(1);
  });

  it('is a number in every event, whatever the clock does and although arrivals fall on the same moment', () => {
    // Steps of a second and a half, ramps and one-night faults: as a clock table that is left out.
    const late: Happening = (t) =>
      (t > 60 ? 0.587 : 0) - (t > 75 ? 1.355 : 0) + (t > 90 && t < 91 ? 0.02 : 0) + (t > 100 ? 1e-4 * (t - 100) : 0);
    const model = modelOf({ frequencyHz: '5.571', frequencyDerivativeHzPerS: -1e-14, epochMjd: EPOCH });
    const happening: Happening = (t, place) => 5.571 * late(t, place);
    const days = Array.from({ length: 150 }, (_, i) => Math.floor(i / 2) * 2 + 0.1);
    const log = simulateTimedArrivals(model, { days, walks: WALKS, uncertaintyUs: 30, happening }, dice(77));
    const watch = startWatch(model, detectorSettings(1, 78));
    for (const [i, arrival] of log.entries()) {
      // Every second arrival at the very moment of the one before it.
      advance(watch, i % 2 === 1 ? { ...arrival, tdb: log[i - 1]!.tdb } : arrival);
      for (const track of watch.tracks) {
        expect(track.logOdds).not.toBeNaN();
        for (const share of Object.values(track.explanations)) expect(share).not.toBeNaN();
      }
    }
    const { events } = report(watch);
    expect(events.length).toBeGreaterThan(0);
    for (const event of events) {
      expect(Number.isFinite(event.logBayesFactor)).toBe(true);
      expect(Number.isFinite(event.falseAlertsPerYearAtThisLevel)).toBe(true);
    }
  });
});
