import { advance, detectorSettings, type PulsarWatch, startWatch } from '../../detectors/index.ts';
import { dice } from './simulatedPulsar.ts';
import { modelOf, type Programme, simulateTimedArrivals } from './simulatedWatch.ts';

export interface QuietPulsar {
  readonly days: readonly number[];
  readonly uncertaintyUs?: number;
  readonly torqueWalk?: number;
  readonly happening?: Programme['happening'];
  readonly seed?: number;
}

export const QUIET_FREQUENCY_HZ = 2.5;

/** A watch that has followed a simulated pulsar through all its arrivals. */
export function followed({ days, uncertaintyUs = 100, torqueWalk = 0, happening, seed = 3 }: QuietPulsar): PulsarWatch {
  const model = modelOf({ frequencyHz: '2.5', frequencyDerivativeHzPerS: -1e-14, epochMjd: 58_000 });
  const walks = { phaseWalk: 0, frequencyWalk: 0, torqueWalk };
  const programme = { days, walks, uncertaintyUs, ...(happening === undefined ? {} : { happening }) };
  const watch = startWatch(model, detectorSettings(1, 100));
  for (const arrival of simulateTimedArrivals(model, programme, dice(seed))) advance(watch, arrival);
  return watch;
}

export function every(days: number, count: number): number[] {
  return Array.from({ length: count }, (_, i) => days * i);
}
