import { describe, expect, it } from 'vitest';
import { advance, detectorSettings, report, startWatch, type TimedArrival } from '../../../detectors/index.ts';
import { logWeightOf } from '../../../detectors/steps/beam.ts';
import type { PulsarWatch } from '../../../detectors/steps/pulsarWatch.ts';
import { dice, observingDays } from '../../support/simulatedPulsar.ts';
import { type Happening, modelOf, simulateTimedArrivals, spinUp } from '../../support/simulatedWatch.ts';

// Families that wait until something speaks for them must give the same answers as families carried through every arrival.

const NU = 3.123456789;
const MODEL = modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -2e-13, epochMjd: 55_000 });
const SETTINGS = { ...detectorSettings(1, 10), windowArrivals: 30 };
const COUNT = 66;
const LEARNED = 40;
const EVENT_AT = 52;

interface Scene {
  readonly what: string;
  readonly seed: number;
  readonly cadenceDays?: number;
  readonly uncertaintyUs?: number;
  readonly frequencyWalk?: number;
  readonly torqueWalk?: number;
  readonly glitch?: number;
  readonly clockUs?: number;
  readonly outliers?: readonly number[];
  readonly receivers?: number;
  readonly bandsMhz?: readonly number[];
}

const SCENES: readonly Scene[] = [
  { what: 'a quiet pulsar', seed: 1, outliers: [30, 47, 61] },
  { what: 'one whose torque walks', seed: 3, torqueWalk: 1e-17, uncertaintyUs: 500 },
  { what: 'a glitch of 5e-9', seed: 4, glitch: 5e-9 },
  { what: 'a glitch of 2e-8, wide errors', seed: 5, glitch: 2e-8, uncertaintyUs: 1000, outliers: [50, 55] },
  { what: 'a glitch in monthly arrivals', seed: 7, glitch: 1e-7, cadenceDays: 30, uncertaintyUs: 500 },
  { what: 'a clock step', seed: 8, clockUs: 600, outliers: [54] },
  { what: 'three receivers and a glitch', seed: 9, receivers: 3, glitch: 3e-8 },
  { what: 'two bands and a clock step', seed: 10, bandsMhz: [700, 1400], clockUs: 900 },
];

function arrivalsOf(scene: Scene): TimedArrival[] {
  const { seed, cadenceDays = 3, uncertaintyUs = 60, frequencyWalk = 1e-14, torqueWalk = 0, receivers = 1 } = scene;
  const random = dice(seed);
  const days = observingDays(COUNT, cadenceDays, 0.6, random);
  const at = days[EVENT_AT]! - 0.4 * cadenceDays;
  const glitch = scene.glitch === undefined ? () => 0 : spinUp(NU, at, scene.glitch);
  const happening: Happening = (t, place) =>
    glitch(t, place) +
    (t > at ? (scene.clockUs ?? 0) * 1e-6 * NU : 0) +
    (scene.outliers?.includes(place.index) ? 0.09 : 0);
  const { bandsMhz = [1400] } = scene;
  const walks = { phaseWalk: 0, frequencyWalk, torqueWalk };
  const arrivals = simulateTimedArrivals(MODEL, { days, walks, uncertaintyUs, happening, bandsMhz }, random);
  return arrivals.map((a) => ({ ...a, receiver: `receiver ${Math.floor(receivers * random.uniform())}` }));
}

function take(watch: PulsarWatch, arrival: TimedArrival, index: number): void {
  if (index === LEARNED) watch.nextLearning = Infinity;
  advance(watch, arrival);
}

/** Both watches after every arrival. */
function sideBySide(scene: Scene, compare: (waiting: PulsarWatch, carrying: PulsarWatch) => void): void {
  const waiting = startWatch(MODEL, SETTINGS);
  const carrying = startWatch(MODEL, SETTINGS);
  carrying.carriesAll = true;
  arrivalsOf(scene).forEach((arrival, index) => {
    take(waiting, arrival, index);
    take(carrying, arrival, index);
    compare(waiting, carrying);
  });
}

/** What was decided, and at which arrivals. */
const decisions = ({ tracks }: PulsarWatch) =>
  tracks.map(({ logOdds, explanations, askAgainAt, rateStep, logPlaces, ...decided }) => decided);

const relative = ({ bank }: PulsarWatch) => {
  const nothing = logWeightOf(bank!.beam);
  return new Map(bank!.families.map((f) => [`${f.kind} ${f.gap}`, f.logWeight - nothing]));
};

describe('families that wait', () => {
  it.each(SCENES)('give the decisions of families that are all carried: $what', (scene) => {
    let carried = 0;
    sideBySide(scene, (waiting, carrying) => {
      expect(decisions(waiting)).toEqual(decisions(carrying));
      const all = relative(carrying);
      const summoned = relative(waiting);
      for (const [name, weight] of summoned) {
        const twin = all.get(name);
        // One that the other bank had dropped 18 nats down for good may be made once more on the way down.
        if (twin === undefined) expect(weight).toBeLessThan(-10);
        else expect(Math.abs(weight - twin)).toBeLessThan(1e-6 * Math.max(1, Math.abs(twin)));
        carried++;
      }
      // None that weighs anything is left waiting.
      const something = Math.max(0, ...all.values());
      for (const [name, weight] of all) if (weight > something - 2) expect(summoned.has(name)).toBe(true);
      waiting.tracks.forEach((track, k) => {
        if (track.state === 'suspected') expect(track.logOdds).toBeCloseTo(carrying.tracks[k]!.logOdds, 2);
      });
    });
    if (scene.glitch !== undefined || scene.clockUs !== undefined) expect(carried).toBeGreaterThan(0);
  });

  it('are not changed by a report in between, which may ask for them', () => {
    const arrivals = arrivalsOf(SCENES.find(({ glitch }) => glitch === 5e-9)!);
    const asked = startWatch(MODEL, SETTINGS);
    const left = startWatch(MODEL, SETTINGS);
    arrivals.forEach((arrival, index) => {
      take(asked, arrival, index);
      take(left, arrival, index);
      if (index > EVENT_AT && index % 6 === 0) report(asked);
    });
    expect(asked.tracks).toEqual(left.tracks);
    expect(asked.bank!.families).toEqual(left.bank!.families);
  });
});
