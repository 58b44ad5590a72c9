/** What is remembered of one pulsar between arrivals. A function of (model, arrivals in time order, settings). */

import { type NoisePrior, noisePrior } from '../filter/noisePrior.ts';
import type { DetectorSettings, NoiseModel } from '../report.ts';
import type { PulsarModel } from '../spin/pulsarModel.ts';
import { type PhaseAtArrival, phaseEvaluator } from '../spin/spinDownModel.ts';
import type { Mjd } from '../time/mjd.ts';
import type { Bank } from './bank.ts';
import type { MeasuredTrack } from './measure.ts';
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
  noise: NoiseModel;
  readonly tracks: Track[];
  /** One pulse count has won; nothing is born, and nothing decided, before. */
  locked: boolean;
  /** Index of the oldest gap that may still hold a new event. */
  oldestGap: number;
  /** Arrivals at which the noise is learned next. */
  nextLearning: number;
  /** Run of unexplained arrivals at which the search for a large step is tried next. */
  nextSearch: number;
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
    tracks: [],
    locked: false,
    oldestGap: 1,
    nextLearning: FIRST_LEARNING,
    nextSearch: 0,
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
