/** From a track and its measurement to the event on record. */

import { normalTail } from '../math/normal.ts';
import type { Estimate } from '../recovery/mixture.ts';
import { mjdNumber } from '../time/mjd.ts';
import { RATE_PER_YEAR } from './births.ts';
import type { Measurement } from './measure.ts';
import type { Explanation, Interval, PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { falseAlertsPerYear } from './threshold.ts';
import type { Track } from './track.ts';

const DAYS_PER_YEAR = 365.25;
const LOG_ODDS_SHOWN = 700;

/** Everything about an event that is not its size. */
type Outline = Pick<
  PulsarEvent,
  | 'id'
  | 'pulsar'
  | 'state'
  | 'firstArrivalMjd'
  | 'suspectedAtMjd'
  | 'confirmedAtMjd'
  | 'arrivalsUsed'
  | 'logBayesFactor'
  | 'falseAlertsPerYearAtThisLevel'
  | 'pulsars'
  | 'site'
>;

export function describe(watch: PulsarWatch, track: Track, measured: Measurement | null): PulsarEvent {
  const { seen } = watch.line;
  const mjdOf = (index: number) => mjdNumber(seen[index]!.arrival.tdb);
  const gapDays = seen[track.bestGap]!.tDays - seen[track.bestGap - 1]!.tDays;
  const logOdds = Math.max(-LOG_ODDS_SHOWN, Math.min(LOG_ODDS_SHOWN, track.logOdds));
  const outline: Outline = {
    id: track.id,
    pulsar: watch.model.name,
    state: track.state,
    firstArrivalMjd: mjdOf(track.bestGap),
    suspectedAtMjd: mjdOf(track.suspectedAt),
    confirmedAtMjd: track.confirmedAt === null ? null : mjdOf(track.confirmedAt),
    arrivalsUsed: measured === null ? 0 : measured.arrivals.filter((a) => a.used).length,
    logBayesFactor: logOdds - Math.log((RATE_PER_YEAR[track.kind] * gapDays) / DAYS_PER_YEAR),
    falseAlertsPerYearAtThisLevel: falseAlertsPerYear(logOdds, watch.settings.pulsarsInProgramme),
    pulsars: [watch.model.name],
    site: track.kind === 'clock step' ? seen[track.bestGap]!.arrival.site : null,
  };
  const negative = measured?.glitch ? shareBelowZero(measured.glitch.deltaNuHz) : 0;
  return {
    ...outline,
    explanation: negative > 0.5 ? 'spin-down glitch' : track.kind,
    explanations: signed(track.explanations, negative),
    ...epochs(watch, track, measured),
    ...sizes(watch, measured),
  };
}

/** Probability that a quantity is negative, as if it were normal. */
function shareBelowZero(e: Estimate): number {
  if (e.interval95[0] > 0) return 0;
  if (e.interval95[1] < 0) return 1;
  return normalTail(e.mean / Math.max(e.sd, Number.MIN_VALUE));
}

/** Of the weight of a step in ν, the share that is a spin-down stands under its own name. */
function signed(explanations: Readonly<Record<string, number>>, negative: number): Record<string, number> {
  const { glitch = 0, ...rest } = explanations;
  return negative === 0
    ? { glitch, ...rest }
    : { glitch: glitch * (1 - negative), 'spin-down glitch': glitch * negative, ...rest };
}

function epochs(
  watch: PulsarWatch,
  track: Track,
  measured: Measurement | null,
): Pick<PulsarEvent, 'epochMjd' | 'epochInterval68' | 'epochInterval95'> {
  const zero = mjdNumber(watch.line.epoch);
  if (measured !== null) {
    const { median, interval68, interval95 } = measured.epochDays;
    return {
      epochMjd: zero + median,
      epochInterval68: [zero + interval68[0], zero + interval68[1]],
      epochInterval95: [zero + interval95[0], zero + interval95[1]],
    };
  }
  const low = zero + watch.line.seen[track.firstGap - 1]!.tDays;
  const high = zero + watch.line.seen[track.lastGap]!.tDays;
  return { epochMjd: (low + high) / 2, epochInterval68: [low, high], epochInterval95: [low, high] };
}

type Sizes = Omit<
  PulsarEvent,
  keyof Outline | 'explanation' | 'explanations' | 'epochMjd' | 'epochInterval68' | 'epochInterval95'
>;

const NO_SIZES: Sizes = {
  deltaNuHz: null,
  deltaNuHzInterval68: null,
  deltaNuHzInterval95: null,
  deltaNuOverNu: null,
  deltaNuOverNuInterval68: null,
  deltaNuDot: null,
  deltaNuDotInterval68: null,
  deltaNuDotOverNuDot: null,
  deltaNuDotOverNuDotInterval68: null,
  timeStepUs: null,
  timeStepUsInterval68: null,
  recovery: { terms: [], q: null },
  aliases: [],
};

function sizes(watch: PulsarWatch, measured: Measurement | null): Sizes {
  if (measured === null) return NO_SIZES;
  const { frequencyHz, frequencyDerivativeHzPerS } = watch.model.spin;
  const nu = frequencyHz.hi;
  const nuDot = frequencyDerivativeHzPerS;
  const { glitch, step } = measured;
  if (glitch !== null) {
    const { deltaNuHz, deltaNuDotHzPerS, recovery } = glitch;
    return {
      ...NO_SIZES,
      deltaNuHz: deltaNuHz.median,
      deltaNuHzInterval68: deltaNuHz.interval68,
      deltaNuHzInterval95: deltaNuHz.interval95,
      deltaNuOverNu: deltaNuHz.median / nu,
      deltaNuOverNuInterval68: scaled(deltaNuHz.interval68, 1 / nu),
      ...torque(deltaNuDotHzPerS, nuDot),
      recovery:
        recovery === null
          ? { terms: [], q: null }
          : {
              terms: [
                {
                  fraction: recovery.fraction.median,
                  fractionInterval68: recovery.fraction.interval68,
                  timescaleDays: recovery.timescaleDays.median,
                  timescaleDaysInterval68: recovery.timescaleDays.interval68,
                },
              ],
              q: recovery.fraction.median,
            },
      aliases: measured.aliases,
    };
  }
  if (step === null) return NO_SIZES;
  const isTorque = Math.abs(measured.frequencyCurve(Number.MAX_SAFE_INTEGER)) > 0;
  return isTorque
    ? { ...NO_SIZES, ...torque(step.size, nuDot) }
    : { ...NO_SIZES, timeStepUs: step.size.median, timeStepUsInterval68: step.size.interval68 };
}

function torque(
  e: Estimate,
  nuDot: number,
): Pick<PulsarEvent, 'deltaNuDot' | 'deltaNuDotInterval68' | 'deltaNuDotOverNuDot' | 'deltaNuDotOverNuDotInterval68'> {
  const relative = nuDot === 0 ? null : 1 / nuDot;
  return {
    deltaNuDot: e.median,
    deltaNuDotInterval68: e.interval68,
    deltaNuDotOverNuDot: relative === null ? null : e.median * relative,
    deltaNuDotOverNuDotInterval68: relative === null ? null : scaled(e.interval68, relative),
  };
}

function scaled([low, high]: Interval, factor: number): Interval {
  return factor < 0 ? [high * factor, low * factor] : [low * factor, high * factor];
}

/** A session that was set aside whole while its neighbours were used. */
export function describeBadSession(
  watch: PulsarWatch,
  session: { readonly first: number; readonly last: number; readonly confirmedAt: number },
): PulsarEvent {
  const { seen } = watch.line;
  const mjdOf = (index: number) => mjdNumber(seen[index]!.arrival.tdb);
  const explanation: Explanation = 'bad session';
  const interval: Interval = [mjdOf(session.first), mjdOf(session.last)];
  return {
    id: `${watch.model.name.replace(/\s+/g, '')}-${Math.floor(interval[0])}-session`,
    pulsar: watch.model.name,
    state: 'confirmed',
    explanation,
    explanations: { [explanation]: 1 },
    epochMjd: interval[0],
    epochInterval68: interval,
    epochInterval95: interval,
    firstArrivalMjd: interval[0],
    suspectedAtMjd: interval[1],
    confirmedAtMjd: mjdOf(session.confirmedAt),
    arrivalsUsed: session.last - session.first + 1,
    logBayesFactor: 0,
    falseAlertsPerYearAtThisLevel: 0,
    pulsars: [watch.model.name],
    site: seen[session.first]!.arrival.site,
    ...NO_SIZES,
  };
}
