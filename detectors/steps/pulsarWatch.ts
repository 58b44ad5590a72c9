/** What is remembered of one pulsar between arrivals. A function of (model, arrivals in time order, settings). */

import { type NoisePrior, noisePrior } from '../filter/noisePrior.ts';
import type { OwnNull } from '../nulls/ownNull.ts';
import type { DetectorSettings, NoiseModel } from '../report.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { type PhaseAtArrival, phaseEvaluator } from '../spin/spinDownModel.ts';
import type { Mjd } from '../time/mjd.ts';
import type { Bank } from './bank.ts';
import type { LargeStep } from './largeStep.ts';
import type { Doubt } from './lostCount.ts';
import type { MeasuredTrack } from './measure.ts';
import type { Loss } from './reacquire.ts';
import { newStateMap, newTimeline, type StateMap, type Timeline } from './timeline.ts';
import type { Track } from './track.ts';

export interface PulsarWatch {
  readonly model: PulsarModel;
  readonly settings: DetectorSettings;
  readonly phaseAt: (tdb: Mjd) => PhaseAtArrival;
  readonly prior: NoisePrior;
  readonly line: Timeline;
  states: StateMap;
  bank: Bank | null;
  /** What decisions use: with the margin. */
  noise: NoiseModel;
  /** The most probable noise, without the margin. */
  likelyNoise: NoiseModel;
  readonly tracks: Track[];
  /** One pulse count has won; nothing is born, and nothing decided, before. */
  locked: boolean;
  /** Index of the first arrival after it was last locked: what did not fit before is settled. */
  lockedFrom: number;
  /** A gap after which the counts are in doubt: nothing is confirmed until they are settled. */
  doubt: Doubt | null;
  /** The count is lost since; it is being sought. */
  lost: Loss | null;
  /** Every explanation of every gap is carried through every arrival: the same answers, slowly. For comparison. */
  carriesAll: boolean;
  /** Index of the oldest gap that may still hold a new event. */
  oldestGap: number;
  /** Arrivals at which the noise is learned next. */
  nextLearning: number;
  /** Null while the arrivals fit. */
  largeStep: LargeStep | null;
  /** What noise alone would do to the odds, where that had to be known: a cache of a pure function. */
  ownNull: OwnNull | null;
  /** Measurements already made, by track: a cache of a pure function. */
  readonly measured: Map<number, MeasuredTrack>;
}

const FIRST_LEARNING = 10;

export function startWatch(model: PulsarModel, settings: DetectorSettings): PulsarWatch {
  const prior = noisePrior(model.spin.frequencyHz.hi, model.spin.frequencyDerivativeHzPerS);
  return {
    model,
    settings,
    phaseAt: phaseEvaluator(model),
    prior,
    line: newTimeline(model.spin.epochTdb),
    states: newStateMap(),
    bank: null,
    noise: asFixed(model, firstNoise(prior)),
    likelyNoise: asFixed(model, firstNoise(prior)),
    tracks: [],
    locked: false,
    lockedFrom: 0,
    doubt: null,
    lost: null,
    carriesAll: false,
    oldestGap: 1,
    nextLearning: FIRST_LEARNING,
    largeStep: null,
    ownNull: null,
    measured: new Map(),
  };
}

function firstNoise(prior: NoisePrior): NoiseModel {
  return {
    phaseWalk: prior.phaseWalk.median,
    frequencyWalk: prior.frequencyWalk.median,
    torqueWalk: prior.torqueWalk.median,
    uncertaintyScale: prior.uncertaintyScale.median,
    floorTurns: 0,
  };
}

/** What the operator fixed in the pulsar's file stands above what was learned. */
export function asFixed(model: PulsarModel, learned: NoiseModel): NoiseModel {
  const { uncertaintyScale = learned.uncertaintyScale, floorUs } = model.noise;
  const floorTurns = floorUs === undefined ? learned.floorTurns : floorUs * 1e-6 * model.spin.frequencyHz.hi;
  return { ...learned, uncertaintyScale, floorTurns };
}
