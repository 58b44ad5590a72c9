/** Names what a confirmed event looks like as a whole, when it is confirmed and again as its arrivals grow. */

import { bestOf } from './counts.ts';
import type { Hypothesis } from './hypothesis.ts';
import { jointOdds } from './jointOdds.ts';
import { seekSwitching } from './modeSwitching.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { followRise } from './relearn.ts';
import { earlierHalf, isShaped, isSlow, weighShapes } from './slowSpinUp.ts';
import { gapsOfEvent, type Track } from './track.ts';

/** Arrivals after the confirmation at which the shape is weighed again. */
const AGAIN: ReadonlySet<number> = new Set([5, 10, 20, 40, 80]);

/** `logOdds`: of `track` beside the events before it. The second half of a slow rise becomes part of the first. */
export function shape(watch: PulsarWatch, track: Track, h: Hypothesis, logOdds: number): void {
  if (!isShaped(track) || track.partOf !== null) return;
  const earlier = earlierHalf(watch, track);
  const joined = earlier && weighShapes(watch, earlier, h, { track, logOdds });
  if (earlier && joined && isSlow({ ...earlier, shapes: joined })) {
    earlier.shapes = joined;
    track.partOf = earlier.number;
  } else track.shapes = weighShapes(watch, track, h);
}

/** True where the events turn out to be switches between two spin-down rates: the noise must be learned anew. */
export function reshape(watch: PulsarWatch, index: number): boolean {
  let again = false;
  for (const track of watch.tracks) {
    if (track.state !== 'confirmed' || track.confirmedAt === null || !AGAIN.has(index - track.confirmedAt)) continue;
    const isWhole = track.modes !== null || watch.tracks.some((t) => t.partOf === track.number);
    // While its size is open, what does not fit speaks for another size, not for another shape.
    if (watch.largeStep !== null && watch.largeStep.track !== null) continue;
    if (isWhole || track.partOf !== null || !isShaped(track)) continue;
    again = true;
    const best = bestOf(watch);
    const before = gapsOfEvent(track).join();
    shape(watch, track, best, earlierHalf(watch, track) ? jointOdds(watch, track, best) : 0);
    const whole = track.partOf === null ? track : watch.tracks[track.partOf]!;
    if (isSlow(whole) && gapsOfEvent(whole).join() !== before) followRise(watch, index, whole);
  }
  return again && seekSwitching(watch, index);
}
