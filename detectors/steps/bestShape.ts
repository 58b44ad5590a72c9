/** The odds of an event in the shape that suits it: what begins as a step may turn out to be the begin of a slow rise. */

import type { Hypothesis } from './hypothesis.ts';
import { jointOdds } from './jointOdds.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { isShaped, isSlow, weighShapes } from './slowSpinUp.ts';
import type { Track } from './track.ts';

/** Event against noise; where a step is no better than noise, as a slow rise if it is one. */
export function oddsInBestShape(watch: PulsarWatch, track: Track, h: Hypothesis): number {
  const sudden = jointOdds(watch, track, h);
  if (sudden > 0 || !isShaped(track) || track.partOf !== null || track.modes !== null) return sudden;
  const { shapes } = track;
  track.shapes = weighShapes(watch, track, h);
  const slow = isSlow(track) ? jointOdds(watch, track, h) : sudden;
  if (slow <= sudden) track.shapes = shapes;
  return Math.max(slow, sudden);
}
