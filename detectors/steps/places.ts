/** Where an event may enter: the gap before an arrival, and the directions in state space that a step may take. */

import { isFelt, isOfClock, type SiteStep } from '../site/siteStep.ts';
import type { BirthPlace } from './births.ts';
import { zeros } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { switchingRecord } from './switchingRecord.ts';
import { dispersionWeight, type Seen } from './timeline.ts';

/** K of the cold-plasma law, s MHz² pc⁻¹ cm³: 1/2.41e-4. */
const DISPERSION_CONSTANT = 1 / 2.41e-4;

/** Turns at 1 GHz per pc cm⁻³. */
export function turnsPerDispersion(watch: PulsarWatch): number {
  return (DISPERSION_CONSTANT / 1e6) * watch.model.spin.frequencyHz.hi;
}

export function birthPlace(watch: PulsarWatch, index: number, gapDays: number): BirthPlace {
  const { spin } = watch.model;
  return {
    frequencyHz: spin.frequencyHz.hi,
    frequencyDerivativeHzPerS: spin.frequencyDerivativeHzPerS,
    gapDays,
    offsetDirections: offsetDirections(watch, index),
    dispersionDirection: dispersionDirection(watch),
    turnsPerDispersion: turnsPerDispersion(watch),
    modes: switchingRecord(watch)?.modes ?? null,
    countKnown: watch.line.seen[index]!.arrival.pulseNumber !== null,
  };
}

/** A time offset of the arrival's whole site and, where that is not the same, of its receiver alone. */
function offsetDirections(watch: PulsarWatch, index: number): number[][] {
  const { groups, seen } = watch.line;
  const own = seen[index]!.group;
  const site = `${seen[index]!.arrival.site}|`;
  const members = groups.map((name) => name.startsWith(site));
  const directions = [offsetDirection(watch, members)];
  if (members.filter(Boolean).length > 1)
    directions.push(
      offsetDirection(
        watch,
        groups.map((_, g) => g === own),
      ),
    );
  return directions;
}

/** Of what is not known of the steps of the site's clock in the gap before the arrival, turns². */
export function clockVariance({ model, line }: PulsarWatch, index: number): number {
  let variance = 0;
  for (const step of model.siteSteps ?? [])
    if (isFirstAfter(step, line.seen, index)) variance += (step.uncertaintyUs * 1e-6 * model.spin.frequencyHz.hi) ** 2;
  return variance;
}

/** Of the arrivals by this clock, the one at `index` is the first after the step. */
function isFirstAfter(step: SiteStep, seen: readonly Seen[], index: number): boolean {
  if (!isFelt(step, seen[index]!.arrival)) return false;
  let before = index - 1;
  while (before >= 0 && !isOfClock(step, seen[before]!.arrival)) before--;
  return before >= 0 && !isFelt(step, seen[before]!.arrival);
}

/** Offsets are kept against the reference group: its own step is one of the deviation, undone in all others. */
function offsetDirection(watch: PulsarWatch, members: readonly boolean[]): number[] {
  const direction = zeros(watch.states.size);
  const base = members[0] === true ? 1 : 0;
  direction[0] = base;
  watch.states.offsets.forEach((at, group) => {
    if (at !== null) direction[at] = (members[group] === true ? 1 : 0) - base;
  });
  return direction;
}

function dispersionDirection(watch: PulsarWatch): number[] | null {
  const { dispersion, size } = watch.states;
  if (dispersion === null) return null;
  const direction = zeros(size);
  direction[0] = dispersionWeight(watch.line.firstBandMhz!);
  direction[dispersion] = 1;
  return direction;
}
