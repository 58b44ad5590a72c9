/** The local spin-down model of a pulsar now: what to fold with, how long it holds, and how far the start model has drifted. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import { followedModel, type ReferenceArrival, type SeenGlitch } from '../spin/followedModel.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { phaseEvaluator } from '../spin/spinDownModel.ts';
import { mjdNumber, normalMjd, SECONDS_PER_DAY } from '../time/mjd.ts';
import { withoutOffset } from './declaredOffsets.ts';
import { copyOf, gapOf, type Hypothesis, propagate } from './hypothesis.ts';
import type { PulsarEvent } from './pulsarEvent.ts';
import type { PulsarWatch } from './pulsarWatch.ts';
import { observationOf } from './timeline.ts';

export interface CurrentModel {
  /** The pulsar's file as it should stand now, in TDB. */
  readonly model: PulsarModel;
  /** Arrivals that it rests on. */
  readonly arrivals: number;
  readonly lastArrivalMjd: number;
  /** False: the count of turns is not certain yet. */
  readonly locked: boolean;
  /** Events in the model that the start model does not know of, oldest first. */
  readonly events: readonly string[];
  /** One standard deviation, at the last arrival. */
  readonly frequencyUncertaintyHz: number;
  readonly frequencyDerivativeUncertaintyHzPerS: number;
  /** Where its phase is good to a tenth of a turn: since the last glitch at the most, until its uncertainty has grown to that. */
  readonly validFromMjd: number;
  readonly validUntilMjd: number;
  /** The used arrivals since `validFromMjd` against the model, turns. */
  readonly rmsTurns: number;
  /** One standard deviation of the predicted phase, days after the last arrival. */
  readonly ahead: readonly { readonly days: number; readonly turns: number }[];
  readonly startModel: StartModelDrift;
}

/** How the start model fares since its phase was last right: since the last glitch, else since the first arrival. */
export interface StartModelDrift {
  readonly sinceMjd: number;
  /** At the last arrival, late positive. */
  readonly turns: number;
  /** By how much the rotation is faster than the start model says, at the last arrival. */
  readonly frequencyOffsetHz: number;
  /** When it has drifted, or will have drifted, by a tenth of a turn; null: not within ten years. */
  readonly tenthOfTurnMjd: number | null;
  readonly reached: boolean;
}

const AHEAD_DAYS = [1, 7, 30, 100];
const SMEARED_TURNS = 0.1;
const LONGEST_DAYS = 3652;
/** Arrivals before a glitch at which the phase across it is joined. */
const JOINED = 5;

/** @param events as reported; null before the first two arrivals. */
export function currentModel(watch: PulsarWatch, events: readonly PulsarEvent[]): CurrentModel | null {
  const last = watch.line.seen.at(-1);
  if (watch.bank === null || last === undefined) return null;
  const h = watch.bank.beam.reduce((a, b) => (b.logWeight > a.logWeight ? b : a));
  const seen = followedArrivals(watch, h);
  const glitches = events.filter(isGlitch);
  const decays = watch.states.decays.map(({ state, timescaleDays }) => ({
    turnsPerDay: h.mean[state]!,
    timescaleDays,
  }));
  const followed = {
    atTdb: last.arrival.tdb,
    turns: h.mean[0]!,
    turnsPerDay: h.mean[1]!,
    turnsPerDay2: h.mean[2]!,
    decays,
  };
  const model = followedModel(
    watch.model,
    followed,
    glitches.map(seenGlitch),
    glitches.map((event) => lastBefore(seen, event.epochMjd)),
  );
  const since = glitches.at(-1)?.epochMjd ?? -Infinity;
  const size = h.mean.length;
  return {
    model,
    arrivals: seen.length,
    lastArrivalMjd: mjdNumber(last.arrival.tdb),
    locked: watch.locked,
    events: glitches.map(({ id }) => id),
    frequencyUncertaintyHz: Math.sqrt(h.cov[size + 1]!) / SECONDS_PER_DAY,
    frequencyDerivativeUncertaintyHzPerS: Math.sqrt(h.cov[2 * size + 2]!) / SECONDS_PER_DAY ** 2,
    ...validity(model, seen, since),
    validUntilMjd: mjdNumber(last.arrival.tdb) + firstDay((days) => phaseSigma(watch, h, days) >= SMEARED_TURNS),
    ahead: AHEAD_DAYS.map((days) => ({ days, turns: phaseSigma(watch, h, days) })),
    startModel: startModelDrift(seen, followed, since),
  };
}

/** Confirmed steps of the rotation itself. */
function isGlitch({ state, site, deltaNuHz, deltaNuDot }: PulsarEvent): boolean {
  return state === 'confirmed' && site === null && (deltaNuHz !== null || deltaNuDot !== null);
}

/** The event's whole step split into what stays and the recoveries that are established. */
function seenGlitch({ epochMjd, deltaNuHz, deltaNuDot, recovery }: PulsarEvent): SeenGlitch {
  const whole = deltaNuHz ?? 0;
  const recoveries = recovery.terms.map(({ fraction, timescaleDays }) => ({
    frequencyStepHz: fraction * whole,
    timescaleDays,
  }));
  // What arrives late is part of the whole step.
  const decaying = recoveries.filter((_, j) => recovery.terms[j]!.kind !== 'delayed rise');
  return {
    epochTdb: normalMjd(epochMjd, 0),
    frequencyStepHz: whole - sum(decaying.map((r) => r.frequencyStepHz)),
    frequencyDerivativeStepHzPerS:
      deltaNuDot === null
        ? 0
        : deltaNuDot + sum(decaying.map((r) => r.frequencyStepHz / (r.timescaleDays * SECONDS_PER_DAY))),
    recoveries,
  };
}

/** A used arrival with what its receiver and the dispersion add taken off. */
interface Followed extends ReferenceArrival {
  readonly mjd: number;
  /** Against the start model, counted through. */
  readonly deviationTurns: number;
}

function followedArrivals(watch: PulsarWatch, h: Hypothesis): Followed[] {
  const all: Followed[] = [];
  const decaying = new Set(watch.states.decays.map(({ state }) => state));
  for (let s = h.story; s !== null; s = s.before) {
    if (!s.used) continue;
    const seen = watch.line.seen[s.index]!;
    const { row } = observationOf(watch.line, s.index, watch.states, watch.noise).sight;
    let addedTurns = 0;
    for (let i = 3; i < h.mean.length; i++) if (!decaying.has(i)) addedTurns += (row[i] ?? 0) * h.mean[i]!;
    const tdb = withoutOffset(watch.model, seen.arrival);
    all.push({
      tdb,
      mjd: mjdNumber(tdb),
      addedTurns,
      sigmaTurns: Math.sqrt(arrivalVariance(seen.sigmaTurns, watch.noise)),
      deviationTurns: seen.deviation + s.turns - addedTurns,
    });
  }
  return all.reverse();
}

function lastBefore(seen: readonly Followed[], mjd: number): readonly Followed[] {
  return seen.filter((arrival) => arrival.mjd < mjd).slice(-JOINED);
}

function validity(
  model: PulsarModel,
  seen: readonly Followed[],
  sinceMjd: number,
): Pick<CurrentModel, 'validFromMjd' | 'rmsTurns'> {
  const phaseAt = phaseEvaluator(model);
  let [from, count, squares] = [seen.at(-1)?.mjd ?? sinceMjd, 0, 0];
  for (const { tdb, mjd, addedTurns } of seen.toReversed()) {
    const turns = phaseAt(tdb).deviationTurns - addedTurns;
    if (mjd < sinceMjd || Math.abs(turns) > SMEARED_TURNS) break;
    [from, count, squares] = [mjd, count + 1, squares + turns ** 2];
  }
  return { validFromMjd: from, rmsTurns: count === 0 ? 0 : Math.sqrt(squares / count) };
}

/** One standard deviation of the phase, days after the last arrival. */
function phaseSigma(watch: PulsarWatch, h: Hypothesis, days: number): number {
  const ahead = copyOf(h);
  propagate(ahead, gapOf(days, watch.noise, watch.states.decays));
  return Math.sqrt(ahead.cov[0]!);
}

function startModelDrift(
  seen: readonly Followed[],
  followed: Parameters<typeof followedModel>[1],
  sinceMjd: number,
): StartModelDrift {
  const reference = lastBefore(seen, sinceMjd).at(-1) ?? seen[0];
  const base = reference?.deviationTurns ?? followed.turns;
  const drift = (days: number) =>
    followed.turns -
    base +
    days * (followed.turnsPerDay + 0.5 * days * followed.turnsPerDay2) -
    sum(followed.decays.map((d) => d.turnsPerDay * d.timescaleDays * Math.expm1(-days / d.timescaleDays)));
  const from = reference?.mjd ?? mjdNumber(followed.atTdb);
  const past = seen.find(({ mjd, deviationTurns }) => mjd > from && Math.abs(deviationTurns - base) >= SMEARED_TURNS);
  const ahead = firstDay((days) => Math.abs(drift(days)) >= SMEARED_TURNS);
  const rate = followed.turnsPerDay + sum(followed.decays.map((d) => d.turnsPerDay));
  return {
    sinceMjd: from,
    turns: drift(0),
    frequencyOffsetHz: -rate / SECONDS_PER_DAY,
    tenthOfTurnMjd: past?.mjd ?? (ahead < LONGEST_DAYS ? mjdNumber(followed.atTdb) + ahead : null),
    reached: past !== undefined,
  };
}

/** The first of the coming days, to a hundredth, from which something is true; ten years when it stays untrue. */
function firstDay(isTrue: (days: number) => boolean): number {
  if (isTrue(0)) return 0;
  let [low, high] = [0, 1 / 64];
  while (!isTrue(high)) {
    if (high >= LONGEST_DAYS) return LONGEST_DAYS;
    [low, high] = [high, Math.min(LONGEST_DAYS, high + Math.max(1 / 64, high / 16))];
  }
  while (high - low > 0.005) {
    const middle = (low + high) / 2;
    if (isTrue(middle)) high = middle;
    else low = middle;
  }
  return high;
}

function sum(values: readonly number[]): number {
  return values.reduce((a, b) => a + b, 0);
}
