import {
  advance,
  detectorSettings,
  type PulsarEvent,
  type PulsarReport,
  report,
  startWatch,
} from '../../detectors/index.ts';
import type { PulsarModel } from '../../detectors/spin/pulsarModel.ts';
import { dice } from './simulatedPulsar.ts';
import { type Programme, simulateTimedArrivals } from './simulatedWatch.ts';

/** Seeded simulated arrivals taken in one by one; the report after all of them, and whether each arrival found the pulsar locked. */
export function watched(
  model: PulsarModel,
  seed: number,
  programme: Programme,
): PulsarReport & { readonly lockedAt: readonly boolean[] } {
  const watch = startWatch(model, detectorSettings(1, 10));
  const lockedAt = simulateTimedArrivals(model, programme, dice(seed)).map((arrival) => {
    advance(watch, arrival);
    return watch.locked;
  });
  return { ...report(watch), lockedAt };
}

export function confirmed({ events }: PulsarReport): readonly PulsarEvent[] {
  return events.filter((e) => e.state === 'confirmed');
}

export function probabilitySum({ explanations }: PulsarEvent): number {
  return Object.values(explanations).reduce((sum, share) => sum + share, 0);
}
