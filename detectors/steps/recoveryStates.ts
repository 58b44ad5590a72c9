/**
 * After a glitch part of Δν decays again, as exponentials of days to months. Followed by states of their own they are neither
 * taken for torque noise nor for further events. Exponentials of one timescale add up, so two states serve all glitches.
 */

import { addState } from './bank.ts';
import type { Decay, Hypothesis } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

/** Days; between them they imitate any single exponential of a few days to a year well enough to follow it. */
const TIMESCALES_DAYS = [8, 60];
/**
 * σ of the decaying part as a share of Δν (from memory of published recovery fractions: mostly below 0.2, up to 0.9): when
 * the past is gone through again, and while the arrivals since the glitch have not been held against it.
 */
export const RECOVERY_SHARE = 0.3;
export const FRESH_RECOVERY_SHARE = 0.1;

/** Gives every hypothesis the states of recovery, once; they are zero until a glitch sets them free. */
export function expectRecovery(watch: PulsarWatch): void {
  if (watch.states.decays.length > 0) return;
  const decays: Decay[] = [];
  let bank = watch.bank!;
  for (const timescaleDays of TIMESCALES_DAYS) {
    decays.push({ state: watch.states.size++, timescaleDays });
    bank = addState(bank, 0);
  }
  watch.states.decays = decays;
  watch.bank = { ...bank, decays };
}

/** `decaying`: σ of the part of the rate step that decays, turns/day. */
export function looseRecovery(h: Hypothesis, decays: readonly Decay[], decaying: number): void {
  const size = h.mean.length;
  for (const { state } of decays) h.cov[state * (size + 1)]! += decaying ** 2;
}
