/** The arrivals of one pulsar as the hypotheses see them: deviations, sessions, receiver groups and bands. */

import type { TimedArrival } from '../arrival.ts';
import { arrivalVariance, SPIN_STATES } from '../filter/stateSpace.ts';
import type { NoiseModel } from '../report.ts';
import { daysBetween, type Mjd } from '../time/mjd.ts';
import type { Observation } from './beam.ts';
import { type Decay, sightOf, zeros } from './hypothesis.ts';

/** One arrival on the time line. */
export interface Seen {
  readonly arrival: TimedArrival;
  /** Days from the spin epoch. */
  readonly tDays: number;
  /** Wrapped, late positive. */
  readonly deviation: number;
  /** Whole pulse number that the start model gives. */
  readonly modelPulse: number;
  readonly sigmaTurns: number;
  readonly group: number;
  /** Sessions are numbered; arrivals of one site less than `SESSION_DAYS` apart share one. */
  readonly session: number;
}

export interface Timeline {
  readonly epoch: Mjd;
  readonly seen: Seen[];
  readonly groups: string[];
  /** Frequency (MHz) of the first band; another band is one that differs by more than a tenth. */
  firstBandMhz: number | null;
  hasBands: boolean;
}

/** Arrivals closer than this at one site are one session, not independent evidence (common practice, no source). */
export const SESSION_DAYS = 0.1;

/** Sessions up to an arrival, its own among them. */
export function sessionsUntil({ seen }: Pick<Timeline, 'seen'>, index: number): number {
  return seen[index]!.session - seen[0]!.session + 1;
}
const BAND_RATIO = 1.1;

export function newTimeline(epoch: Mjd): Timeline {
  return { epoch, seen: [], groups: [], firstBandMhz: null, hasBands: false };
}

/** Adds an arrival; says whether it is the first of a receiver group or of a second band. */
export function append(
  line: Timeline,
  arrival: TimedArrival,
  phase: { readonly pulseNumber: number; readonly deviationTurns: number; readonly frequencyHz: number },
): { readonly newGroup: boolean; readonly newBand: boolean } {
  const tDays = daysBetween(arrival.tdb, line.epoch);
  const name = `${arrival.site}|${arrival.receiver}`;
  let group = line.groups.indexOf(name);
  const newGroup = group < 0;
  if (newGroup) group = line.groups.push(name) - 1;
  const newBand = !line.hasBands && isNewBand(line, arrival.frequencyMhz);
  if (line.firstBandMhz === null && Number.isFinite(arrival.frequencyMhz)) line.firstBandMhz = arrival.frequencyMhz;
  if (newBand) line.hasBands = true;
  const last = line.seen.at(-1);
  const same = last !== undefined && last.arrival.site === arrival.site && tDays - last.tDays < SESSION_DAYS;
  line.seen.push({
    arrival,
    tDays,
    deviation: phase.deviationTurns,
    modelPulse: phase.pulseNumber,
    sigmaTurns: arrival.uncertaintyUs * 1e-6 * phase.frequencyHz,
    group,
    session: last === undefined ? 0 : last.session + (same ? 0 : 1),
  });
  return { newGroup: newGroup && group > 0, newBand };
}

/** The groups that share the site of an arrival; null when that is all of them. */
export function groupsOfSite(line: Timeline, index: number): readonly number[] | null {
  const site = `${line.seen[index]!.arrival.site}|`;
  const members = line.groups.flatMap((name, group) => (name.startsWith(site) ? [group] : []));
  return members.length === line.groups.length ? null : members;
}

function isNewBand(line: Timeline, mhz: number): boolean {
  if (line.firstBandMhz === null || !Number.isFinite(mhz)) return false;
  const ratio = mhz / line.firstBandMhz;
  return ratio > BAND_RATIO || ratio < 1 / BAND_RATIO;
}

/** Which state holds what, beyond the spin: index into the state vector, or null while there is none. */
export interface StateMap {
  size: number;
  dispersion: number | null;
  /** By group; null for the reference group. */
  readonly offsets: (number | null)[];
  /** Empty until a glitch is believed. */
  decays: readonly Decay[];
}

export function newStateMap(): StateMap {
  return { size: SPIN_STATES, dispersion: null, offsets: [null], decays: [] };
}

/** (1 GHz / f)²: how strongly an arrival feels a turn of dispersion at 1 GHz. */
export function dispersionWeight(frequencyMhz: number): number {
  const ratio = 1000 / frequencyMhz;
  return ratio * ratio;
}

export function observationOf(line: Timeline, index: number, map: StateMap, noise: NoiseModel): Observation {
  const seen = line.seen[index]!;
  const row = zeros(map.size);
  row[0] = 1;
  const offset = map.offsets[seen.group] ?? null;
  if (offset !== null) row[offset] = 1;
  if (map.dispersion !== null)
    row[map.dispersion] = dispersionWeight(seen.arrival.frequencyMhz) - dispersionWeight(line.firstBandMhz!);
  const before = line.seen[index - 1];
  return {
    index,
    deviation: seen.deviation,
    variance: arrivalVariance(seen.sigmaTurns, noise),
    sight: sightOf(row),
    turnsToNumber: seen.arrival.pulseNumber === null ? null : seen.modelPulse - seen.arrival.pulseNumber,
    sameSession: before !== undefined && before.session === seen.session,
  };
}
