/** The record of a pulsar that is known to switch between two spin-down rates. */

import type { PulsarWatch } from './pulsarWatch.ts';
import type { Track } from './track.ts';

/** What is known of a switching pulsar. */
export interface Modes {
  /** |Δν̇| between the two, turns/day². */
  readonly stepTurns: number;
  readonly switchesPerYear: number;
  /** Posterior probability that the changes are switches, not changes that happen to agree. */
  readonly share: number;
}

/** The record that holds all switches of the pulsar, once it is known to switch. */
export function switchingRecord(watch: PulsarWatch): Track | undefined {
  return watch.tracks.find((t) => t.modes !== null && t.state === 'confirmed');
}

export function isSwitch(watch: PulsarWatch, track: Track): boolean {
  const record = switchingRecord(watch);
  return record !== undefined && (track === record || track.partOf === record.number);
}
