/**
 * Glitch, change of the spin-down rate, or a rise of ν over weeks: the bank takes a slow rise for one or two of the first
 * two. So when such an event is confirmed, and at each learning of the noise, the three shapes are fitted and weighed.
 */

import { fitGlitch } from '../recovery/glitchFit.ts';
import { fitRamp, RAMP_DURATIONS_DAYS, type RampFit } from '../recovery/rampFit.ts';
import { fitStep } from '../recovery/stepFit.ts';
import { RATE_PER_YEAR } from './births.ts';
import { countedArrivals, disturbances } from './counts.ts';
import type { Hypothesis } from './hypothesis.ts';
import { runStart } from './largeStep.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { type Rise, type Shapes, slowRise, type Track } from './track.ts';

/** Rises over weeks in one pulsar (common practice, no source: a handful of pulsars have shown any). */
const SLOW_RATE_PER_YEAR = 0.005;
/** A rise may have begun so long before it was taken for a step, and its end be taken for a second step. */
export const LONGEST_RISE_DAYS = 120;
/** Gaps on each side of the most probable one that the step may lie in. */
const MOST_GAPS = 2;
const REACH = 200;
const DAYS_PER_YEAR = 365.25;
/** Natural log of the prior of one rise: its rate, one of six decades of sizes, one of the durations. */
export const LOG_RISE_PRIOR =
  Math.log((SLOW_RATE_PER_YEAR * LONGEST_RISE_DAYS) / DAYS_PER_YEAR) - Math.log(6 * RAMP_DURATIONS_DAYS.length);
const SECONDS_PER_DAY = 86_400;

/** The event before `track` that may be the begin of the rise of which `track` is the end. */
export function earlierHalf(watch: PulsarWatch, track: Track): Track | undefined {
  const { seen } = watch.line;
  const days = (t: Track) => seen[track.bestGap]!.tDays - seen[t.bestGap]!.tDays;
  return watch.tracks.findLast(
    (t) =>
      t.number < track.number &&
      t.state === 'confirmed' &&
      t.partOf === null &&
      t.modes === null &&
      isShaped(t) &&
      days(t) >= 0 &&
      days(t) < LONGEST_RISE_DAYS,
  );
}

export function isShaped(track: Track): boolean {
  return track.kind === 'glitch' || track.kind === 'spin-down-rate change';
}

/**
 * Weighs the shapes of `track` with the counts of `h`. `second`: a later event that the rise would explain too, with its
 * natural-log odds beside the first alone.
 */
export function weighShapes(
  watch: PulsarWatch,
  track: Track,
  h: Hypothesis,
  second?: { readonly track: Track; readonly logOdds: number },
): Shapes | null {
  const from = Math.max(0, track.bestGap - REACH);
  const until = Math.min(watch.line.seen.length, track.bestGap + REACH);
  // A rise that was taken for a step leaves the arrivals after it set aside: they tell the shapes apart.
  const run = runStart(h, watch.line.seen.length - 1, watch.lockedFrom);
  const arrivals = countedArrivals(watch, h)
    .map((a, i) => (i >= Math.max(run, track.bestGap) ? { ...a, used: true } : a))
    .slice(from, until);
  const others = disturbances(watch, track)
    .filter((d) => d.beforeIndex !== second?.track.bestGap && d.beforeIndex > from && d.beforeIndex < until)
    .map((d) => ({ ...d, beforeIndex: d.beforeIndex - from }));
  const gap = track.bestGap - from;
  const last = arrivals.length - 1;
  const used = (a: { readonly used: boolean }) => a.used;
  const given = {
    arrivals,
    noise: watch.noise,
    disturbances: others,
    frequencyHz: watch.model.spin.frequencyHz.hi,
    frequencyDerivativeHzPerS: watch.model.spin.frequencyDerivativeHzPerS,
    mostTerms: 1 as const,
  };
  const near = {
    firstGapBeforeIndex: Math.max(1, gap - MOST_GAPS),
    lastGapBeforeIndex: Math.min(last, gap + MOST_GAPS),
  };
  const first = arrivals.findIndex((a) => a.tDays > arrivals[gap]!.tDays - LONGEST_RISE_DAYS);
  const wide = {
    firstGapBeforeIndex: Math.max(2, Math.min(first, gap - 1)),
    lastGapBeforeIndex: near.lastGapBeforeIndex,
  };
  if (wide.firstGapBeforeIndex >= gap || !arrivals.slice(0, wide.firstGapBeforeIndex).some(used)) return null;
  if (!arrivals.slice(near.lastGapBeforeIndex).some(used)) return null;
  const prior = (ratePerYear: number, w: typeof near) =>
    Math.log(
      (ratePerYear * (arrivals[w.lastGapBeforeIndex]!.tDays - arrivals[w.firstGapBeforeIndex - 1]!.tDays)) /
        DAYS_PER_YEAR,
    );
  const glitch = fitGlitch({ ...given, ...near });
  const change = fitStep({ ...given, ...near, kind: 'spin-down rate' });
  const ramp = fitRamp({ ...given, ...wide });
  const later = Math.max(0, second?.logOdds ?? 0);
  const logMasses = {
    glitch: glitch.logEvidence + prior(RATE_PER_YEAR.glitch, near) + later,
    'spin-down-rate change': change.logEvidenceStep + prior(RATE_PER_YEAR['spin-down-rate change'], near) + later,
    'slow spin-up': ramp.step.size.mean > 0 ? ramp.logEvidence + prior(SLOW_RATE_PER_YEAR, wide) : -Infinity,
  };
  const highest = Math.max(...Object.values(logMasses));
  const masses = Object.entries(logMasses).map(([name, mass]) => [name, Math.exp(mass - highest)] as const);
  const total = masses.reduce((sum, [, mass]) => sum + mass, 0);
  return {
    shares: Object.fromEntries(masses.map(([name, mass]) => [name, mass / total])),
    firstGap: wide.firstGapBeforeIndex + from,
    lastGap: wide.lastGapBeforeIndex + from,
    rise: ramp.step.size.mean > 0 ? riseOf(watch, ramp) : null,
  };
}

function riseOf({ line: { seen } }: PulsarWatch, { step, durationDays }: RampFit): Rise {
  const gapAfter = (tDays: number) => seen.findIndex((s) => s.tDays > tDays);
  const days = durationDays.median;
  const lastGap = gapAfter(step.bestEpochDays + days);
  return {
    firstGap: gapAfter(step.bestEpochDays),
    lastGap: lastGap < 0 ? null : lastGap,
    days,
    stepTurns: (step.size.mean * SECONDS_PER_DAY) / days,
  };
}

export function isSlow(track: Track): boolean {
  return slowRise(track) !== null;
}
