import type { TimedArrival } from '../../detectors/arrival.ts';
import type { Walks } from '../../detectors/filter/stateSpace.ts';
import { parseDoubleDouble } from '../../detectors/spin/doubleDouble.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { phaseEvaluator } from '../../detectors/spin/spinDownModel.ts';
import { addSeconds, normalMjd } from '../../detectors/time/mjd.ts';
import { type Dice, simulateWalk } from './simulatedPulsar.ts';

/** A model that is right but for what a test puts on top. */
export function modelOf(given: {
  readonly name?: string;
  readonly frequencyHz: string;
  readonly frequencyDerivativeHzPerS: number;
  readonly epochMjd: number;
}): PulsarModel {
  return {
    name: given.name ?? 'KR 0000+00',
    rightAscensionRad: 0,
    declinationRad: 0,
    positionEpochMjd: given.epochMjd,
    properMotionMasPerYr: [0, 0],
    parallaxMas: 0,
    dispersionMeasure: 0,
    spin: {
      epochTdb: { day: given.epochMjd, fraction: 0 },
      frequencyHz: parseDoubleDouble(given.frequencyHz)!,
      frequencyDerivativeHzPerS: given.frequencyDerivativeHzPerS,
      frequencySecondDerivativeHzPerS2: 0,
    },
    glitches: [],
    noise: {},
    alerts: { extraRecipients: [] },
  };
}

/** What happens on top of the model: deviation in turns (late positive) at `tDays` from the spin epoch. */
export type Happening = (tDays: number, place: { readonly frequencyMhz: number; readonly index: number }) => number;

export interface Programme {
  readonly days: readonly number[];
  readonly walks: Walks;
  readonly uncertaintyUs: number;
  readonly bandsMhz?: readonly number[];
  readonly happening?: Happening;
}

/** Arrivals at the barycentre: the model's own whole turns, moved by walk, happening and white noise. */
export function simulateTimedArrivals(model: PulsarModel, programme: Programme, random: Dice): TimedArrival[] {
  const phaseAt = phaseEvaluator(model);
  const { days, uncertaintyUs, bandsMhz = [1400] } = programme;
  const walk = simulateWalk(days, programme.walks, random);
  const nu = model.spin.frequencyHz.hi;
  return days.map((tDays, index) => {
    const near = normalMjd(model.spin.epochTdb.day, tDays);
    const onTurn = addSeconds(near, -phaseAt(near).deviationTurns / nu);
    const frequencyMhz = bandsMhz[index % bandsMhz.length]!;
    const happening = programme.happening?.(tDays, { frequencyMhz, index }) ?? 0;
    const seconds = (walk[index]! + happening) / nu + uncertaintyUs * 1e-6 * random.normal();
    return {
      key: String(index),
      tdb: addSeconds(onTurn, seconds),
      uncertaintyUs,
      frequencyMhz,
      site: 'kestrel ridge',
      receiver: 'main',
      pulseNumber: null,
    };
  });
}

/** Deviation of a spin-up: early pulses, from `epochDays` on. */
export function spinUp(frequencyHz: number, epochDays: number, relativeSize: number): Happening {
  return (t) => (t > epochDays ? -relativeSize * frequencyHz * 86_400 * (t - epochDays) : 0);
}
