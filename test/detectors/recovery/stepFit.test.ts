import { describe, expect, it } from 'vitest';
import type { CountedArrival } from '../../../detectors/filter/countedArrival.ts';
import { fitGlitch } from '../../../detectors/recovery/glitchFit.ts';
import { fitStep, type StepFitInput, type StepKind } from '../../../detectors/recovery/stepFit.ts';
import { dice, observingDays, simulateArrivals } from '../../support/simulatedPulsar.ts';

const frequencyHz = 10;
const frequencyDerivativeHzPerS = -1e-12;
const walks = { phaseWalk: 1e-9, frequencyWalk: 1e-11, torqueWalk: 1e-16 };
const AFTER = 60;

function pulsar(seed: number): { arrivals: CountedArrival[]; epochDays: number } {
  const random = dice(seed);
  const days = observingDays(100, 5, 0.8, random);
  const arrivals = simulateArrivals(days, walks, 3e-4, random).map((arrival, i) => ({
    ...arrival,
    frequencyMhz: i % 2 === 0 ? 600 : 1400,
    group: i % 3 === 0 ? 1 : 0,
  }));
  return { arrivals, epochDays: 0.5 * (days[AFTER - 1]! + days[AFTER]!) };
}

function stepped(
  { arrivals, epochDays }: ReturnType<typeof pulsar>,
  turns: (arrival: CountedArrival, since: number) => number,
): CountedArrival[] {
  return arrivals.map((arrival) => {
    const since = arrival.tDays - epochDays;
    return since <= 0 ? arrival : { ...arrival, deviationTurns: arrival.deviationTurns + turns(arrival, since) };
  });
}

function inputFor(arrivals: readonly CountedArrival[], kind: StepKind): StepFitInput {
  return {
    arrivals,
    noise: { ...walks, uncertaintyScale: 1, floorTurns: 0 },
    firstGapBeforeIndex: AFTER - 1,
    lastGapBeforeIndex: AFTER + 1,
    disturbances: [],
    frequencyHz,
    frequencyDerivativeHzPerS,
    kind,
  };
}

type Evidences = Partial<Record<StepKind | 'glitch', number>>;

/** Every kind of step, and the glitch, held against the same arrivals. */
function evidences(arrivals: readonly CountedArrival[], group?: number): Evidences {
  const kinds: StepKind[] = ['time', 'dispersion', 'spin-down rate'];
  const found: Evidences = { glitch: fitGlitch(inputFor(arrivals, 'time')).logEvidence };
  for (const kind of kinds) {
    found[kind] = fitStep({
      ...inputFor(arrivals, kind),
      ...(group === undefined ? {} : { groups: [group] }),
    }).logEvidenceStep;
  }
  return found;
}

function mostLikely(evidence: Evidences): string {
  return Object.entries(evidence).reduce((a, b) => (b[1] > a[1] ? b : a))[0];
}

describe('steps that are no glitch', () => {
  it('a clock step: late by 500 µs, whatever the frequency', () => {
    const arrivals = stepped(pulsar(51), () => 500e-6 * frequencyHz);
    const fit = fitStep(inputFor(arrivals, 'time'));
    expect(fit.size.interval95[0]).toBeLessThan(500);
    expect(fit.size.interval95[1]).toBeGreaterThan(500);
    expect(fit.size.sd).toBeLessThan(50);
    expect(fit.logEvidenceStep - fit.logEvidenceNone).toBeGreaterThan(20);
    expect(fit.curve({ tDays: 400, frequencyMhz: 800, group: 0 })).toBeCloseTo(fit.size.mean * 1e-6 * frequencyHz, 5);
    expect(fit.curve({ tDays: 10, frequencyMhz: 800, group: 0 })).toBe(0);
    expect(mostLikely(evidences(arrivals))).toBe('time');
  });

  it('a clock step of one receiver group leaves the others alone', () => {
    const arrivals = stepped(pulsar(52), ({ group }) => (group === 1 ? -800e-6 * frequencyHz : 0));
    const own = fitStep({ ...inputFor(arrivals, 'time'), groups: [1] });
    const all = fitStep(inputFor(arrivals, 'time'));
    expect(own.size.interval95[0]).toBeLessThan(-800);
    expect(own.size.interval95[1]).toBeGreaterThan(-800);
    expect(own.logEvidenceStep - all.logEvidenceStep).toBeGreaterThan(20);
    expect(own.curve({ tDays: 400, frequencyMhz: 800, group: 0 })).toBeCloseTo(0, 15);
  });

  it('a dispersion step: 0.02 pc cm⁻³ is 42.3 µs at 1400 MHz and 230 µs at 600 MHz', () => {
    // Dispersion constant 1/2.41e-4 s MHz² pc⁻¹ cm³ (common practice; Kulkarni 2020, arXiv:2007.02886).
    const delayS = (frequencyMhz: number): number => (0.02 / 2.41e-4) * frequencyMhz ** -2;
    expect(delayS(1400)).toBeCloseTo(42.3e-6, 7);
    const arrivals = stepped(pulsar(53), ({ frequencyMhz }) => delayS(frequencyMhz) * frequencyHz);
    const fit = fitStep(inputFor(arrivals, 'dispersion'));
    expect(fit.size.interval95[0]).toBeLessThan(42.3);
    expect(fit.size.interval95[1]).toBeGreaterThan(42.3);
    expect(fit.size.interval95[0]).toBeGreaterThan(20);
    expect(mostLikely(evidences(arrivals))).toBe('dispersion');
  });

  it('a change of the spin-down rate: −5e-15 Hz/s makes pulses late', () => {
    const change = -5e-15;
    const arrivals = stepped(pulsar(54), (_, since) => -0.5 * change * (since * 86_400) ** 2);
    expect(arrivals.at(-1)!.deviationTurns).toBeGreaterThan(0.1);
    const fit = fitStep(inputFor(arrivals, 'spin-down rate'));
    expect(fit.size.interval95[0]).toBeLessThan(change);
    expect(fit.size.interval95[1]).toBeGreaterThan(change);
    expect(fit.size.interval95[1]).toBeLessThan(0);
    const evidence = evidences(arrivals);
    expect(evidence['spin-down rate']).toBeGreaterThan(evidence.time! + 5);
    expect(evidence['spin-down rate']).toBeGreaterThan(evidence.dispersion! + 5);
    expect(evidence['spin-down rate']).toBeGreaterThan(evidence.glitch!);
  });

  it('nothing: no step is preferred', () => {
    const { arrivals } = pulsar(55);
    const none = fitStep(inputFor(arrivals, 'time')).logEvidenceNone;
    for (const value of Object.values(evidences(arrivals))) expect(value).toBeLessThan(none + 1);
  });
});
