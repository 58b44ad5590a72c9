/**
 * The recovery of the latest glitch is followed with the timescale that its arrivals ask for: two fixed exponentials
 * imitate another to some per cent only, and of a large glitch seen precisely those would make an event of their own.
 */

import { fitGlitch } from '../recovery/glitchFit.ts';
import { countedArrivals, disturbances } from './counts.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

/** Arrivals on each side of the glitch that the timescale rests on. */
const REACH = 120;
/** The second exponential stands so far off the fitted one: between them they bend to what the fit leaves. */
const APART = 4;
const MIDDLE_DAYS = 30;
/** A timescale this close to the one in use is not worth going through the past again. */
const CLOSE = 1.15;

/** Fits the latest glitch's recovery; true when the states' timescales have changed and the past must be gone through again. */
export function retimeRecovery(watch: PulsarWatch): boolean {
  const [first, second] = watch.states.decays;
  const glitch = watch.tracks.findLast((t) => t.state === 'confirmed' && t.kind === 'glitch');
  if (first === undefined || second === undefined || glitch === undefined) return false;
  const timescaleDays = fittedTimescale(watch, glitch.bestGap, glitch.number);
  if (timescaleDays === null) return false;
  const ratio = timescaleDays / first.timescaleDays;
  if (ratio < CLOSE && ratio > 1 / CLOSE) return false;
  watch.states.decays = [
    { state: first.state, timescaleDays },
    { state: second.state, timescaleDays: secondTimescale(timescaleDays) },
  ];
  return true;
}

/** Days. */
export function secondTimescale(timescaleDays: number): number {
  return timescaleDays < MIDDLE_DAYS ? timescaleDays * APART : timescaleDays / APART;
}

/** Days; null where the evidence for a recovery is small. Mere suspicions after the glitch are left to the recovery. */
function fittedTimescale(watch: PulsarWatch, bestGap: number, number: number): number | null {
  const from = Math.max(0, bestGap - REACH);
  const until = Math.min(watch.line.seen.length, bestGap + REACH);
  const arrivals = countedArrivals(watch, watch.bank!.beam[0]!).slice(from, until);
  const believed = { ...watch, tracks: watch.tracks.filter((t) => t.state === 'confirmed') };
  const others = disturbances(believed, watch.tracks[number]);
  const gap = bestGap - from;
  const used = (a: { readonly used: boolean }) => a.used;
  if (!arrivals.slice(0, gap - 1).some(used) || !arrivals.slice(gap + 1).some(used)) return null;
  const fit = fitGlitch({
    arrivals,
    noise: watch.noise,
    firstGapBeforeIndex: Math.max(1, gap - 1),
    lastGapBeforeIndex: Math.min(arrivals.length - 1, gap + 1),
    disturbances: others
      .map((d) => ({ ...d, beforeIndex: d.beforeIndex - from }))
      .filter((d) => d.beforeIndex > 0 && d.beforeIndex < arrivals.length),
    frequencyHz: watch.model.spin.frequencyHz.hi,
    frequencyDerivativeHzPerS: watch.model.spin.frequencyDerivativeHzPerS,
    mostTerms: 1,
  });
  return fit.recovery?.terms[0]?.timescaleDays.median ?? null;
}
