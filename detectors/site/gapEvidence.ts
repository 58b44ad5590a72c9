/**
 * One pulsar's word on each gap between its sessions: by how many turns its phase stepped there, and how surely. One
 * whitening pass; the response of the filter to a unit step of the clock follows the recursion of Willsky & Jones 1976
 * (IEEE Trans. AC 21, 108), so that what the rotation would absorb of the step is not counted.
 */

import { SPIN_STATES } from '../filter/stateSpace.ts';
import {
  absorbArrival,
  createWhiteningFilter,
  expectArrival,
  loosen,
  predict,
  type WhiteningFilter,
} from '../filter/whiteningFilter.ts';
import type { PulsarTimes, Session } from './pulsarTimes.ts';

/** A step in phase, modulo one turn, late positive. */
export interface PhaseStep {
  readonly turns: number;
  readonly variance: number;
  /** More than one session shows it: no bad session does. */
  readonly lasts: boolean;
}

export interface GapEvidence {
  readonly pulsar: string;
  readonly frequencyHz: number;
  /** Sessions of the same clock before and after the gap, MJD at the site. */
  readonly afterMjd: number;
  readonly beforeMjd: number;
  /** From the first session after the gap alone, and from all within `HORIZON_DAYS`. */
  readonly first: PhaseStep;
  readonly all: PhaseStep;
}

/** Sessions so long after a gap still speak of a step in it: later, the rotation has absorbed it. */
export const HORIZON_DAYS = 20;
/** Predictions wider than this (turns) say nothing of a step, and the pulsar's own count is trusted. */
const WIDE_TURNS = 0.1;
const OUTLIER_SIGMAS = 4;
/** So many sessions set aside in a row: the pulsar itself has moved on. */
const REACQUIRE_SESSIONS = 4;
/** Flat priors: turns, turns/day, turns/day². */
const FREE = [10, 1, 1e-3] as const;
const RECEIVER_OFFSET_TURNS = 0.3;

export interface OpenGap {
  readonly session: Session;
  readonly afterMjd: number;
  readonly first: Omit<PhaseStep, 'lasts'>;
  /** A step that the filter set aside shows again in the session after it; null: not looked at yet. */
  isSeenAgain: boolean | null;
  heard: number;
  /** What the filter makes of a unit step. */
  readonly response: Float64Array;
  information: number;
  pull: number;
  closed: boolean;
}

/** A pulsar on the way through its sessions, as one clock sees it. */
export interface GapWalk {
  readonly filter: WhiteningFilter;
  readonly open: readonly OpenGap[];
  readonly setAside: number;
  /** The last session of the clock, MJD. */
  readonly before: number | null;
  /** Index of the next session. */
  readonly next: number;
}

export function startWalk({ places }: PulsarTimes): GapWalk {
  const offsets = places.slice(1).map(() => RECEIVER_OFFSET_TURNS);
  return { filter: createWhiteningFilter([...FREE, ...offsets]), open: [], setAside: 0, before: null, next: 0 };
}

/** Goes on with a copy: the walk itself stays where it is. */
export function copyOfWalk({ filter, open, ...rest }: GapWalk): GapWalk {
  return {
    ...rest,
    filter: { ...filter, means: filter.means.slice(), factor: filter.factor.slice() },
    open: open.map((gap) => ({ ...gap, response: gap.response.slice() })),
  };
}

/**
 * Past the next session. The walk given is used up.
 * @param isMember by place: whether the clock in question is the one there
 * @param lateTurns what earlier steps of the site did to that session
 * @param found gaps that no later session can speak of
 */
export function walkOn(
  walk: GapWalk,
  times: PulsarTimes,
  { isMember, lateTurns, found }: { isMember: readonly boolean[]; lateTurns: number; found: GapEvidence[] },
): GapWalk {
  const { filter, next } = walk;
  let { setAside, before } = walk;
  const session = times.sessions[next]!;
  const deltaDays = next === 0 ? 0 : session.tDays - times.sessions[next - 1]!.tDays;
  predict(filter, deltaDays, times.walks);
  const row = new Float64Array(filter.size);
  row[0] = 1;
  if (session.place > 0) row[SPIN_STATES - 1 + session.place] = 1;
  const deviation = session.deviationTurns - lateTurns;
  const member = isMember[session.place]!;
  let seen: Seen = { row, member, ...compared(filter, row, deviation, session.varianceTurns2) };
  const open = stillOpen(walk.open, session.siteMjd, { found, times });
  for (const gap of open) {
    carry(gap, deltaDays);
    observeGap(gap, seen);
  }
  if (member) {
    // After a session that was set aside, nobody knows on which side of it the phase stepped; and sessions are in the order of the
    // barycentre, so that by the clock one may come before the last.
    const isForward = before !== null && session.siteMjd > before;
    if (isForward && !seen.wide && setAside === 0) open.push(opened(session, before!, seen));
    before = Math.max(before ?? -Infinity, session.siteMjd);
  }
  if (session.freed || setAside >= REACQUIRE_SESSIONS) {
    // What the gap shows against the rotation before it is noted; then the rotation is followed anew.
    setFree(filter);
    seen = { row, member, ...compared(filter, row, deviation, session.varianceTurns2) };
    for (const gap of open) gap.closed = true;
  }
  if (seen.used) {
    absorbArrival(filter, [filter.expected[0]! + seen.innovation], session.varianceTurns2);
    for (const gap of open) respond(gap, filter, seen);
    setAside = 0;
  } else setAside++;
  return { filter, open, setAside, before, next: next + 1 };
}

interface Seen {
  readonly row: Float64Array;
  /** The clock in question took it. */
  readonly member: boolean;
  readonly innovation: number;
  readonly variance: number;
  readonly wide: boolean;
  readonly used: boolean;
}

function setFree(filter: WhiteningFilter): void {
  const work = new Float64Array(filter.size);
  for (let state = 0; state < SPIN_STATES; state++) {
    const direction = new Float64Array(filter.size);
    direction[state] = 1;
    loosen(filter, direction, FREE[state]!, work);
  }
}

/** A session against what the rotation so far predicts: by the pulsar's own count where that fits, else to the nearest turn. */
function compared(
  filter: WhiteningFilter,
  row: Float64Array,
  deviation: number,
  own: number,
): Omit<Seen, 'row' | 'member'> {
  expectArrival(filter, row);
  const variance = filter.expectedVariance + own;
  const wide = variance > WIDE_TURNS ** 2;
  const limit = OUTLIER_SIGMAS ** 2 * variance;
  const counted = deviation - filter.expected[0]!;
  if (wide || counted ** 2 < limit) return { innovation: counted, variance, wide, used: true };
  const innovation = counted - Math.round(counted);
  return { innovation, variance, wide, used: innovation ** 2 < limit };
}

function opened(session: Session, afterMjd: number, seen: Seen): OpenGap {
  const first = { turns: seen.innovation, variance: seen.variance };
  const response = new Float64Array(seen.row.length);
  return {
    session,
    afterMjd,
    first,
    response,
    isSeenAgain: seen.used ? false : null,
    heard: 1,
    information: 1 / seen.variance,
    pull: seen.innovation / seen.variance,
    closed: !seen.used,
  };
}

/** The part of a unit step that this session shows. */
function shown(gap: OpenGap, { row, member }: Seen): number {
  let expected = 0;
  for (let k = 0; k < row.length; k++) expected += row[k]! * gap.response[k]!;
  return (member ? 1 : 0) - expected;
}

function observeGap(gap: OpenGap, seen: Seen): void {
  if (gap.isSeenAgain === null && seen.member) {
    const moved = seen.innovation - gap.first.turns;
    gap.isSeenAgain = !seen.used && (moved - Math.round(moved)) ** 2 < OUTLIER_SIGMAS ** 2 * seen.variance;
  }
  if (gap.closed) return;
  if (!seen.used) {
    gap.closed = true;
    return;
  }
  const signature = shown(gap, seen);
  if (seen.member) gap.heard++;
  gap.information += signature ** 2 / seen.variance;
  gap.pull += (signature * seen.innovation) / seen.variance;
}

/** What the filter made of the step so far goes on as a rotation does. */
function carry({ response }: OpenGap, deltaDays: number): void {
  response[0] = response[0]! + deltaDays * response[1]! + 0.5 * deltaDays * deltaDays * response[2]!;
  response[1] = response[1]! + deltaDays * response[2]!;
}

function respond(gap: OpenGap, { gain }: WhiteningFilter, seen: Seen): void {
  if (gap.closed) return;
  const signature = shown(gap, seen);
  for (let k = 0; k < gain.length; k++) gap.response[k] = gap.response[k]! + gain[k]! * signature;
}

/** Lets the gaps go that lie too far back, with what was found of them. */
function stillOpen(
  open: readonly OpenGap[],
  nowMjd: number,
  { found, times }: { readonly found: GapEvidence[]; readonly times: PulsarTimes },
): OpenGap[] {
  return open.filter((gap) => {
    if (nowMjd <= gap.session.siteMjd + HORIZON_DAYS) return true;
    found.push(evidenceOf(gap, times));
    return false;
  });
}

/** What an open gap shows so far. */
export function evidenceOf(gap: OpenGap, { pulsar, frequencyHz }: PulsarTimes): GapEvidence {
  const { afterMjd, information, pull, session } = gap;
  const isSeenAgain = gap.isSeenAgain === true;
  const first = { ...gap.first, lasts: isSeenAgain };
  const all = { turns: pull / information, variance: 1 / information, lasts: isSeenAgain || gap.heard > 1 };
  return { pulsar, frequencyHz, afterMjd, beforeMjd: session.siteMjd, first, all };
}
