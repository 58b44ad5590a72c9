import { describe, expect, it } from 'vitest';
import { type PulsarTimes, siteEvents, siteSteps } from '../../../detectors/index.ts';
import { FIRST_MJD, type QuietPulsar, siteSessions } from '../../support/siteSessions.ts';

const STEP_DAY = 50;

/** Six pulsars with periods from 4 ms to 1.4 s. */
const FREQUENCIES_HZ = [0.714, 1.93, 3.31, 7.7, 29.9, 250.1];

function programme(
  lateS: QuietPulsar['lateS'],
  options: { readonly uncertaintyUs?: number; readonly count?: number; readonly seed?: number } = {},
): PulsarTimes[] {
  const { uncertaintyUs = 60, count = FREQUENCIES_HZ.length, seed = 1 } = options;
  return FREQUENCIES_HZ.slice(0, count).map((frequencyHz, i) =>
    siteSessions({
      name: `KR 000${i}+00`,
      frequencyHz,
      uncertaintyUs,
      seed: 10 * seed + i,
      lateS,
      startDays: 0.15 * i,
    }),
  );
}

const stepOf = (seconds: number) => (daysIn: number) => (daysIn > STEP_DAY ? seconds : 0);

describe('the clock of a site', () => {
  it('is left alone when nothing happened', () => {
    for (let seed = 1; seed <= 5; seed++) expect(siteSteps(programme(() => 0, { seed }))).toEqual([]);
  });

  it('shows a step that no pulsar shows by itself', () => {
    // 150 µs: two errors and a half of one session.
    const [step, ...others] = siteSteps(programme(stepOf(150e-6)));
    expect(others).toEqual([]);
    expect(Math.abs(step!.stepUs - 150)).toBeLessThan(3 * step!.uncertaintyUs);
    expect(step!.interval95[0]).toBeLessThan(FIRST_MJD + STEP_DAY + 1);
    expect(step!.interval95[1]).toBeGreaterThan(FIRST_MJD + STEP_DAY - 1);
    expect(step!.pulsars.length).toBeGreaterThanOrEqual(3);
  });

  it.each([0.58683523793, -1, -1.3553108])(
    'counts a step of %s s although it is many turns of the fast pulsars',
    (size) => {
      const [step, ...others] = siteSteps(programme(stepOf(size)));
      expect(others).toEqual([]);
      expect(Math.abs(step!.stepUs - size * 1e6)).toBeLessThan(4 * step!.uncertaintyUs);
      expect(step!.uncertaintyUs).toBeLessThan(60);
      expect(step!.pulsars).toHaveLength(FREQUENCIES_HZ.length);
    },
  );

  it('needs three pulsars, or two that are sure', () => {
    expect(siteSteps(programme(stepOf(80e-6), { count: 1 }))).toEqual([]);
    expect(siteSteps(programme(stepOf(2e-3), { count: 1 }))).toEqual([]);
    expect(siteSteps(programme(stepOf(2e-3), { count: 2 }))).toHaveLength(1);
  });

  it('is not blamed for what one pulsar does', () => {
    const quiet = programme(() => 0);
    const [own] = programme(stepOf(3e-3));
    expect(siteSteps([own!, ...quiet.slice(1)])).toEqual([]);
  });

  it('is blamed although one pulsar did something of its own that night', () => {
    const [, ...others] = programme(stepOf(400e-6), { count: 4 });
    const [own] = programme(stepOf(400e-6 + 0.11));
    const steps = siteSteps([own!, ...others]);
    expect(steps).toHaveLength(1);
    expect(Math.abs(steps[0]!.stepUs - 400)).toBeLessThan(3 * steps[0]!.uncertaintyUs);
    expect(steps[0]!.pulsars).toEqual(others.map(({ pulsar }) => pulsar));
  });

  it('does not step for the pulsars of another site', () => {
    const here = programme(stepOf(1e-3));
    const there = FREQUENCIES_HZ.map((frequencyHz, i) =>
      siteSessions({
        name: `KR 100${i}+00`,
        frequencyHz,
        uncertaintyUs: 60,
        seed: 100 + i,
        lateS: () => 0,
        site: 'elsewhere',
      }),
    );
    const [step, ...others] = siteSteps([...here, ...there]);
    expect(others).toEqual([]);
    expect(step!.site).toBe('kestrel ridge');
    expect(step!.pulsars.every((pulsar) => pulsar.startsWith('KR 000'))).toBe(true);
  });

  it('steps there and back, days later', () => {
    const steps = siteSteps(programme((daysIn) => (daysIn > 40 && daysIn < 52 ? 0.0476 : 0)));
    expect(steps.map(({ stepUs }) => Math.round(stepUs / 1000))).toEqual([48, -48]);
    expect(siteEvents(steps).map(({ explanation }) => explanation)).toEqual(['clock step', 'clock step']);
  });

  it('off for one night is one event', () => {
    const steps = siteSteps(programme((daysIn) => (daysIn > 49.9 && daysIn < 51 ? 2e-3 : 0)));
    const events = siteEvents(steps);
    expect(events.map(({ explanation, site }) => ({ explanation, site }))).toEqual([
      { explanation: 'bad session', site: 'kestrel ridge' },
    ]);
    expect(events[0]!.pulsars).toHaveLength(FREQUENCIES_HZ.length);
  });

  it('is the same whatever the order of the pulsars', () => {
    const pulsars = programme(stepOf(-0.3555));
    expect(siteSteps([...pulsars].reverse())).toEqual(siteSteps(pulsars));
  });
});
