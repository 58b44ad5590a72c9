import type { CountedArrival, Disturbance } from './countedArrival.ts';
import { SPIN_STATES } from './stateSpace.ts';

/** Frequency at which a dispersion step is stated, MHz. */
const REFERENCE_FREQUENCY_MHZ = 1400;

/** Bands count as two when f⁻² differs by more than this fraction of the largest. */
const BAND_SPREAD = 0.1;

/**
 * The static states that a set of arrivals can carry beside the spin: one offset for each receiver group beyond the
 * first that is present, and one dispersion state (turns at the reference frequency) when there are two bands or more.
 */
export interface NuisanceLayout {
  /** Group → state index; the reference group is absent. */
  readonly offsetStates: ReadonlyMap<number, number>;
  readonly dispersionState: number | null;
  /** 3 + static states. */
  readonly size: number;
}

/** Dispersion's share of an arrival's delay: (f_ref/f)²; 0 at infinite frequency. */
export function dispersionCoefficient(frequencyMhz: number): number {
  const ratio = REFERENCE_FREQUENCY_MHZ / frequencyMhz;
  return ratio * ratio;
}

/** Only arrivals in use count. */
export function nuisanceLayout(arrivals: readonly CountedArrival[]): NuisanceLayout {
  const groups = new Set<number>();
  let low = Number.POSITIVE_INFINITY;
  let high = 0;
  for (const { used, group, frequencyMhz } of arrivals) {
    if (!used) continue;
    groups.add(group);
    const coefficient = dispersionCoefficient(frequencyMhz);
    low = Math.min(low, coefficient);
    high = Math.max(high, coefficient);
  }
  let size = SPIN_STATES;
  const offsetStates = new Map<number, number>();
  for (const group of [...groups].sort((a, b) => a - b).slice(1)) offsetStates.set(group, size++);
  const dispersionState = high - low > BAND_SPREAD * high ? size++ : null;
  return { offsetStates, dispersionState, size };
}

/** Writes the row h of `deviation = h·state + noise` for one arrival (length `layout.size`). */
export function writeSensitivity(layout: NuisanceLayout, arrival: CountedArrival, out: Float64Array): void {
  out.fill(0);
  out[0] = 1;
  const offset = layout.offsetStates.get(arrival.group);
  if (offset !== undefined) out[offset] = 1;
  if (layout.dispersionState !== null) out[layout.dispersionState] = dispersionCoefficient(arrival.frequencyMhz);
}

/**
 * Writes the direction in state space along which a step in one group's clock moves the state: its offset; for the
 * reference group the phase, less every other offset.
 */
export function writeOffsetDirection(layout: NuisanceLayout, group: number, out: Float64Array): void {
  out.fill(0);
  const offset = layout.offsetStates.get(group);
  if (offset !== undefined) {
    out[offset] = 1;
    return;
  }
  out[0] = 1;
  for (const other of layout.offsetStates.values()) out[other] = -1;
}

/** Whether the disturbance lies after the first and at or before the last arrival in use, so that it can be seen. */
export function isInside(disturbance: Disturbance, firstUsed: number, lastUsed: number): boolean {
  return disturbance.beforeIndex > firstUsed && disturbance.beforeIndex <= lastUsed;
}
