/** The sizes of an event as they stand on record: what the data do not constrain is null, never a number of the prior's. */

import type { GlitchFit, TermEstimate } from '../recovery/glitchFit.ts';
import type { Estimate } from '../recovery/mixture.ts';
import type { Measurement } from './measure.ts';
import type { Interval, PulsarEvent, RecoveryTerm } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

export type EventSizes = Pick<
  PulsarEvent,
  | 'deltaNuHz'
  | 'deltaNuHzInterval68'
  | 'deltaNuHzInterval95'
  | 'deltaNuOverNu'
  | 'deltaNuOverNuInterval68'
  | 'deltaNuOverNuInterval95'
  | keyof Torque
  | 'timeStepUs'
  | 'timeStepUsInterval68'
  | 'riseDays'
  | 'riseDaysInterval68'
  | 'recovery'
  | 'aliases'
>;

type Torque = Pick<
  PulsarEvent,
  | 'deltaNuDot'
  | 'deltaNuDotInterval68'
  | 'deltaNuDotInterval95'
  | 'deltaNuDotOverNuDot'
  | 'deltaNuDotOverNuDotInterval68'
  | 'deltaNuDotOverNuDotInterval95'
>;

const NO_TORQUE: Torque = {
  deltaNuDot: null,
  deltaNuDotInterval68: null,
  deltaNuDotInterval95: null,
  deltaNuDotOverNuDot: null,
  deltaNuDotOverNuDotInterval68: null,
  deltaNuDotOverNuDotInterval95: null,
};

export const NO_SIZES: EventSizes = {
  deltaNuHz: null,
  deltaNuHzInterval68: null,
  deltaNuHzInterval95: null,
  deltaNuOverNu: null,
  deltaNuOverNuInterval68: null,
  deltaNuOverNuInterval95: null,
  ...NO_TORQUE,
  timeStepUs: null,
  timeStepUsInterval68: null,
  riseDays: null,
  riseDaysInterval68: null,
  recovery: { terms: [], q: null, qInterval68: null, qInterval95: null },
  aliases: [],
};

export function sizesOf(watch: PulsarWatch, measured: Measurement | null): EventSizes {
  if (measured === null) return NO_SIZES;
  const { frequencyHz, frequencyDerivativeHzPerS: nuDot } = watch.model.spin;
  const nu = frequencyHz.hi;
  const { glitch, step } = measured;
  if (glitch !== null) {
    return {
      ...NO_SIZES,
      ...frequencyStep(glitch.deltaNuHz, nu),
      ...(glitch.deltaNuDotConstrained ? torque(glitch.deltaNuDotHzPerS, nuDot) : NO_TORQUE),
      recovery: recoveryOf(glitch),
      aliases: measured.aliases,
    };
  }
  if (measured.ramp !== undefined) {
    const { deltaNuHz, durationDays } = measured.ramp;
    return {
      ...NO_SIZES,
      ...frequencyStep(deltaNuHz, nu),
      riseDays: durationDays.median,
      riseDaysInterval68: durationDays.interval68,
    };
  }
  if (step === null) return NO_SIZES;
  const isTorque = Math.abs(measured.frequencyCurve(Number.MAX_SAFE_INTEGER)) > 0;
  return isTorque
    ? { ...NO_SIZES, ...torque(step.size, nuDot) }
    : { ...NO_SIZES, timeStepUs: step.size.median, timeStepUsInterval68: step.size.interval68 };
}

function frequencyStep(deltaNuHz: Estimate, nu: number) {
  return {
    deltaNuHz: deltaNuHz.median,
    deltaNuHzInterval68: deltaNuHz.interval68,
    deltaNuHzInterval95: deltaNuHz.interval95,
    deltaNuOverNu: deltaNuHz.median / nu,
    deltaNuOverNuInterval68: scaled(deltaNuHz.interval68, 1 / nu),
    deltaNuOverNuInterval95: scaled(deltaNuHz.interval95, 1 / nu),
  };
}

function recoveryOf({ recovery }: GlitchFit): PulsarEvent['recovery'] {
  if (recovery === null) return NO_SIZES.recovery;
  const { terms, q } = recovery;
  return { terms: terms.map(termOf), q: q.median, qInterval68: q.interval68, qInterval95: q.interval95 };
}

function termOf({ kind, fraction, timescaleDays }: TermEstimate): RecoveryTerm {
  return {
    kind,
    fraction: fraction.median,
    fractionInterval68: fraction.interval68,
    fractionInterval95: fraction.interval95,
    timescaleDays: timescaleDays.median,
    timescaleDaysInterval68: timescaleDays.interval68,
    timescaleDaysInterval95: timescaleDays.interval95,
  };
}

function torque(e: Estimate, nuDot: number): Torque {
  const relative = nuDot === 0 ? null : 1 / nuDot;
  return {
    deltaNuDot: e.median,
    deltaNuDotInterval68: e.interval68,
    deltaNuDotInterval95: e.interval95,
    deltaNuDotOverNuDot: relative === null ? null : e.median * relative,
    deltaNuDotOverNuDotInterval68: relative === null ? null : scaled(e.interval68, relative),
    deltaNuDotOverNuDotInterval95: relative === null ? null : scaled(e.interval95, relative),
  };
}

function scaled([low, high]: Interval, factor: number): Interval {
  return factor < 0 ? [high * factor, low * factor] : [low * factor, high * factor];
}
