/**
 * Some pulsars switch between two spin-down rates (Lyne et al. 2010, Science 329, 408). A change of the rate that goes back to
 * where an earlier one came from, again and again, is that: said once, and later switches are expected.
 */

import type { Estimate } from '../recovery/mixture.ts';
import { measure } from './measure.ts';
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

/** Share of pulsars that switch (common practice, no source). */
const PRIOR_SHARE = 0.01;
const LEAST_SWITCHES = 3;
/** Two rates agree no better than to this share of their difference: the modes drift. */
const DRIFT = 0.1;
/** Sizes of changes that do not belong together are spread over so many natural-log units. */
const LOG_SIZE_RANGE = Math.log(1e3);
const DAYS_PER_YEAR = 365.25;
const SECONDS_PER_DAY = 86_400;

/** The record that holds all switches of the pulsar, once it is known to switch. */
export function switchingRecord(watch: PulsarWatch): Track | undefined {
  return watch.tracks.find((t) => t.modes !== null && t.state === 'confirmed');
}

/** After a change of the spin-down rate is confirmed: are the latest changes switches between two rates? */
export function judgeSwitching(watch: PulsarWatch, latest: Track): void {
  const changes = watch.tracks
    .filter((t) => t.kind === 'spin-down-rate change' && t.state === 'confirmed')
    .sort((a, b) => a.bestGap - b.bestGap);
  const sizes = changes.map((t) => sizeOf(watch, t));
  let first = changes.length - 1;
  let logOdds = Math.log(PRIOR_SHARE);
  for (; first > 0; first--) {
    const gain = logMatch(sizes[first - 1] ?? null, sizes[first] ?? null);
    if (gain < 0) break;
    logOdds += gain;
  }
  const chain = changes.slice(first);
  const share = 1 / (1 + Math.exp(-logOdds));
  if (chain.length < LEAST_SWITCHES || share < 0.5) {
    if (latest.partOf === switchingRecord(watch)?.number) latest.partOf = null;
    return;
  }
  const host = chain[0]!;
  const { seen } = watch.line;
  const years = (seen[latest.bestGap]!.tDays - seen[host.bestGap]!.tDays) / DAYS_PER_YEAR;
  const steps = sizes.slice(first).map((s) => Math.abs(s!.mean) * SECONDS_PER_DAY ** 2);
  const stepTurns = steps.reduce((a, b) => a + b, 0) / steps.length;
  host.modes = { stepTurns, switchesPerYear: (chain.length - 1) / Math.max(years, 1 / DAYS_PER_YEAR), share };
  host.shapes = null;
  host.partOf = null;
  for (const t of chain.slice(1)) Object.assign(t, { partOf: host.number, modes: null, shapes: null });
}

/** The change itself, Hz/s, whatever shape it was given before. */
function sizeOf(watch: PulsarWatch, track: Track): Estimate | null {
  return measure(watch, { ...track, shapes: null })?.step?.size ?? null;
}

/** Natural log of how much better "back to the rate before" foretells the second size than "any size". */
function logMatch(a: Estimate | null, b: Estimate | null): number {
  if (a === null || b === null) return -Infinity;
  const size = Math.max(Math.abs(a.mean), Math.abs(b.mean));
  const sigma = Math.hypot(a.sd, b.sd, DRIFT * size);
  const miss = (a.mean + b.mean) / sigma;
  return -0.5 * miss * miss + Math.log((2 * size * LOG_SIZE_RANGE) / (Math.sqrt(2 * Math.PI) * sigma));
}
