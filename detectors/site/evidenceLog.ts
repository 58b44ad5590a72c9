/**
 * What one pulsar says of one clock, worked out as far as it is asked for and kept: only the sessions after the first that changed
 * are gone through again. The answer is the same as if all had been.
 */

import {
  copyOfWalk,
  evidenceOf,
  type GapEvidence,
  type GapWalk,
  HORIZON_DAYS,
  startWalk,
  walkOn,
} from './gapEvidence.ts';
import type { PulsarTimes, Session } from './pulsarTimes.ts';

/** The walk is kept as it was before every so many sessions, so many times: late sessions are seldom older. */
const KEPT_EVERY = 16;
const MOST_KEPT = 6;
/** Sessions are in the order of the barycentre, not of the site's clock. */
export const OUT_OF_ORDER_DAYS = 1;

interface Kept {
  readonly walk: GapWalk;
  /** Gaps that were closed by then. */
  readonly closed: number;
}

export class EvidenceLog {
  readonly #isMember: readonly boolean[];
  #times: PulsarTimes | null = null;
  #late: Float64Array = new Float64Array();
  #closed: GapEvidence[] = [];
  #walk: GapWalk | null = null;
  #kept: Kept[] = [];

  /** @param isMember by place of the pulsar: whether the clock is the one there */
  constructor(isMember: readonly boolean[]) {
    this.#isMember = isMember;
  }

  /** @param late turns by which the steps known of its sites made each of the pulsar's sessions late */
  take(times: PulsarTimes, late: Float64Array): void {
    if (times === this.#times && late === this.#late) return;
    const same = this.#times === null ? 0 : sameSessions(this.#times, times, (i) => this.#late[i] === late[i]);
    this.#times = times;
    this.#late = late;
    if (this.#walk !== null && this.#walk.next <= same) return;
    this.#kept = this.#kept.filter(({ walk }) => walk.next <= same);
    this.#walk = null;
  }

  /** The gaps between the pulsar's sessions by this clock that end after one moment and not after another, MJD, in order of time. */
  gaps(fromMjd: number, toMjd: number): GapEvidence[] {
    const times = this.#times!;
    const { sessions } = times;
    let walk = this.#walk ?? this.#resumed(times);
    // Taken away while in use: what went wrong in between is gone through again.
    this.#walk = null;
    while (walk.next < sessions.length && sessions[walk.next]!.siteMjd <= toMjd + HORIZON_DAYS + OUT_OF_ORDER_DAYS) {
      if (walk.next % KEPT_EVERY === 0) this.#keep(walk);
      const lateTurns = this.#late[walk.next]!;
      walk = walkOn(walk, times, { isMember: this.#isMember, lateTurns, found: this.#closed });
    }
    this.#walk = walk;
    let first = this.#closed.length;
    while (first > 0 && this.#closed[first - 1]!.beforeMjd > fromMjd) first--;
    const all = [...this.#closed.slice(first), ...walk.open.map((gap) => evidenceOf(gap, times))];
    return all.filter(({ beforeMjd }) => beforeMjd > fromMjd && beforeMjd <= toMjd);
  }

  #resumed(times: PulsarTimes): GapWalk {
    const last = this.#kept.pop();
    this.#closed.length = last?.closed ?? 0;
    return last?.walk ?? startWalk(times);
  }

  #keep(walk: GapWalk): void {
    this.#kept.push({ walk: copyOfWalk(walk), closed: this.#closed.length });
    if (this.#kept.length > MOST_KEPT) this.#kept.shift();
  }
}

/** How many sessions from the first on are the same in both, and as `isSame` says; 0 when the pulsar is not the same. */
export function sameSessions(a: PulsarTimes, b: PulsarTimes, isSame: (index: number) => boolean = () => true): number {
  if (a !== b && !isSamePulsar(a, b)) return 0;
  const most = Math.min(a.sessions.length, b.sessions.length);
  let i = 0;
  while (i < most && isSame(i) && (a === b || isSameSession(a.sessions[i]!, b.sessions[i]!))) i++;
  return i;
}

function isSamePulsar(a: PulsarTimes, b: PulsarTimes): boolean {
  return (
    a.frequencyHz === b.frequencyHz &&
    a.walks.phaseWalk === b.walks.phaseWalk &&
    a.walks.frequencyWalk === b.walks.frequencyWalk &&
    a.walks.torqueWalk === b.walks.torqueWalk &&
    a.places.length === b.places.length &&
    a.places.every((place, i) => place === b.places[i])
  );
}

function isSameSession(a: Session, b: Session): boolean {
  return (
    a.siteMjd === b.siteMjd &&
    a.tDays === b.tDays &&
    a.deviationTurns === b.deviationTurns &&
    a.varianceTurns2 === b.varianceTurns2 &&
    a.place === b.place &&
    a.freed === b.freed
  );
}
