/**
 * What silence is worth: the smallest glitch that would have been confirmed with 90 % probability, and after how long. From
 * the signatures, the learned noise and the cadence alone: no data. A pure step of ν at a random time is meant.
 */

import type { PulsarWatch } from '../steps/pulsarWatch.ts';
import { type LimitAfter, limitCurve } from './limitCurve.ts';
import { asBefore, atCadence, type Programme } from './programme.ts';

export interface DetectionLimit {
  /** Null while nothing true can be said; then `reason` says why. */
  readonly deltaNuOverNu90: number | null;
  readonly delayDays90: number | null;
  readonly reason: string | null;
  /** What is seen sooner must be larger; earliest first. */
  readonly curve: readonly LimitAfter[];
}

/** A limit is for what is confirmed within a year, or within ten arrivals where those take longer. */
const HORIZON = { days: 365.25, least: 10 };
/** A longer wait that makes the limit less than a tenth smaller is not worth being called the delay. */
const WORTH_WAITING = 1.1;

/** As the pulsar has been observed of late. */
export function detectionLimit(watch: PulsarWatch): DetectionLimit {
  return limitOf(watch, (horizon) => asBefore(watch, horizon));
}

/** If it were observed every `everyDays`, as well as it usually is. */
export function limitAtCadence(watch: PulsarWatch, everyDays: number): DetectionLimit {
  return limitOf(watch, (horizon) => atCadence(watch, horizon, everyDays));
}

function limitOf(watch: PulsarWatch, programme: (horizon: typeof HORIZON & { readonly most: number }) => Programme) {
  if (watch.line.seen.length === 0) return none('no arrivals yet');
  if (!watch.locked) return none('the pulse count is not settled yet: alerts are held');
  const curve = limitCurve(watch, programme({ ...HORIZON, most: watch.settings.windowArrivals })).filter((l) =>
    Number.isFinite(l.deltaNuOverNu90),
  );
  const best = curve.at(-1);
  if (best === undefined) return none('at this cadence and noise no glitch of any likely size is confirmed in time');
  const { deltaNuOverNu90, delayDays } = curve.find((l) => l.deltaNuOverNu90 <= WORTH_WAITING * best.deltaNuOverNu90)!;
  return { deltaNuOverNu90, delayDays90: delayDays, reason: null, curve };
}

function none(reason: string): DetectionLimit {
  return { deltaNuOverNu90: null, delayDays90: null, reason, curve: [] };
}
