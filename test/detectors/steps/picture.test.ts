import { expect, test } from 'vitest';
import { modelOf } from '../../support/simulatedWatch.ts';
import { confirmed, watched } from '../../support/watched.ts';

// Against the truth that was put in: a glitch whose Δν̇ stands far above the errors of a local fit.

const NU = 6.34;
const STEP_DAY = 180;
const DELTA_NU = 3e-7;
const DELTA_NU_DOT = -6e-14;

const glitch = (tDays: number) => {
  const seconds = (tDays - STEP_DAY) * 86_400;
  return seconds < 0 ? 0 : -DELTA_NU * seconds - 0.5 * DELTA_NU_DOT * seconds ** 2;
};

const report = watched(modelOf({ frequencyHz: String(NU), frequencyDerivativeHzPerS: -4e-13, epochMjd: 60_000 }), 5, {
  days: Array.from({ length: 110 }, (_, i) => 3 * i),
  walks: { phaseWalk: 0, frequencyWalk: 0, torqueWalk: 0 },
  uncertaintyUs: 200,
  happening: glitch,
});
const event = confirmed(report)[0]!;
const picture = report.pictures.get(event.id)!;

test('the tracks of ν and ν̇ follow the step, on both sides and never across it', () => {
  const secondsAfter = (mjd: number) => (mjd - 60_000 - STEP_DAY) * 86_400;
  expect(picture.spinDownTrack!.length).toBeGreaterThan(10);
  for (const { mjd, deltaNuDot, uncertainty } of picture.spinDownTrack!) {
    const truth = secondsAfter(mjd) < 0 ? 0 : DELTA_NU_DOT;
    // The parabola taken off is fitted too, with everything at once; five of these errors leave room for it.
    expect(Math.abs(deltaNuDot - truth) / uncertainty).toBeLessThan(5);
    expect(uncertainty).toBeLessThan(Math.abs(DELTA_NU_DOT));
  }
  for (const { mjd, deltaNuHz, uncertaintyHz } of picture.frequencyTrack) {
    const after = secondsAfter(mjd);
    const truth = after < 0 ? 0 : DELTA_NU + DELTA_NU_DOT * after;
    expect(Math.abs(deltaNuHz - truth) / uncertaintyHz).toBeLessThan(5);
  }
});

test('the fitted ν̇ is nothing before the event and its own Δν̇ long after', () => {
  const fit = picture.spinDownFit!;
  expect(Math.abs(fit[0]!.deltaNuDot)).toBe(0);
  expect(Math.abs(fit.at(-1)!.deltaNuDot / DELTA_NU_DOT - 1)).toBeLessThan(0.2);
  expect(fit.every(({ deltaNuDot }) => Math.abs(deltaNuDot) < 10 * Math.abs(DELTA_NU_DOT))).toBe(true);
});

test('the small picture holds the last sixty arrivals, flat but for the event, and the cadence', () => {
  const { points, everyDays } = report.recent;
  expect([points.length, everyDays]).toEqual([60, 3]);
  expect([points.at(-1)![0], points[0]![0]]).toEqual([0, -177]);
  expect(points.every(([, , uncertainty]) => uncertainty > 0)).toBe(true);
});
