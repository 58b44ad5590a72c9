/** Glitches spin pulsars up: a step down must bring more evidence than a step up. */

import { normalTail } from '../math/normal.ts';
import type { Estimate } from '../recovery/mixture.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { measure } from './measure.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import type { Track } from './track.ts';

/** Of all steps in ν, those down: of rotation-powered pulsars (common practice, no source), and where both signs are usual. */
const SPIN_DOWN_SHARE = 0.03;
const EVEN_SHARE = 0.5;
/** G; above it pulsars behave as magnetars, which also spin down in steps: the quantum critical field m²c³/(eħ). */
const CRITICAL_FIELD = 4.414e13;

/**
 * Natural log of the prior of the step's sign against a prior that is even: at most ln 2. The bank's own sizes are even in
 * sign, so this is added to its odds.
 */
export function logSignWeight(watch: PulsarWatch, track: Track): number {
  const size = track.kind === 'glitch' ? measure(watch, track)?.glitch?.deltaNuHz : undefined;
  if (size === undefined) return 0;
  return logSignPrior(watch.model, shareBelowZero(size));
}

/** The same for a step that is negative with a given probability. */
export function logSignPrior(model: PulsarModel, negative: number): number {
  const down = spinDownShare(model);
  return Math.log(2 * ((1 - negative) * (1 - down) + negative * down));
}

function spinDownShare({ spin }: PulsarModel): number {
  const nu = spin.frequencyHz.hi;
  const nuDot = spin.frequencyDerivativeHzPerS;
  // Dipole field at the equator, 3.2e19 G √(P Ṗ), P in seconds (standard convention, e.g. Manchester & Taylor 1977).
  const field = nuDot < 0 ? 3.2e19 * Math.sqrt(-nuDot / nu ** 3) : 0;
  return nuDot > 0 || field > CRITICAL_FIELD ? EVEN_SHARE : SPIN_DOWN_SHARE;
}

/** Probability that a quantity is negative, as if it were normal. */
export function shareBelowZero(e: Estimate): number {
  if (e.interval95[0] > 0) return 0;
  if (e.interval95[1] < 0) return 1;
  return normalTail(e.mean / Math.max(e.sd, Number.MIN_VALUE));
}
