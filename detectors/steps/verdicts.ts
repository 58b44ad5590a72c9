/** What was done with each arrival, and why, in words. */

import { arrivalVariance } from '../filter/stateSpace.ts';
import type { ArrivalVerdict } from '../report.ts';
import { bestOf } from './counts.ts';
import type { Story } from './hypothesis.ts';
import type { PulsarWatch } from './pulsarWatch.ts';

export function verdictsOf(watch: PulsarWatch): ArrivalVerdict[] {
  if (watch.bank === null) return watch.line.seen.map((_, i) => verdict(watch, i, null));
  const decisions: Story[] = [];
  for (let s: Story | null = bestOf(watch).story; s !== null; s = s.before) decisions[s.index] = s;
  return watch.line.seen.map((_, i) => verdict(watch, i, decisions[i] ?? null));
}

function verdict(watch: PulsarWatch, index: number, decision: Story | null): ArrivalVerdict {
  const seen = watch.line.seen[index]!;
  const turns = decision?.turns ?? 0;
  const used = decision?.used ?? true;
  return {
    key: seen.arrival.key,
    pulseNumber: seen.modelPulse - turns,
    deviationTurns: seen.deviation + turns,
    uncertaintyTurns: Math.sqrt(arrivalVariance(seen.sigmaTurns, watch.noise)),
    fate: used ? 'used' : 'set aside',
    reason: used
      ? watch.locked
        ? 'agrees with the rotation as followed'
        : 'used; the pulse count is not yet certain'
      : 'far from the rotation as followed: an outlier unless later arrivals agree with it',
  };
}

/** Sessions of two or more arrivals that were all set aside, once two later sessions have been used. */
export function badSessions(watch: PulsarWatch): { first: number; last: number; confirmedAt: number }[] {
  if (watch.bank === null || !watch.locked) return [];
  const used: boolean[] = [];
  for (let s: Story | null = bestOf(watch).story; s !== null; s = s.before) used[s.index] = s.used;
  const { seen } = watch.line;
  const found: { first: number; last: number; confirmedAt: number }[] = [];
  for (let first = 0; first < seen.length; ) {
    let last = first;
    while (last + 1 < seen.length && seen[last + 1]!.session === seen[first]!.session) last++;
    const bad = last > first && used.slice(first, last + 1).every((u) => !u);
    const confirmedAt = bad ? secondSessionAfter(watch, used, last) : null;
    if (confirmedAt !== null) found.push({ first, last, confirmedAt });
    first = last + 1;
  }
  return found;
}

/** The first used arrival of the second session used after `last`; null while there is none, or while more are bad. */
function secondSessionAfter(watch: PulsarWatch, used: readonly boolean[], last: number): number | null {
  const sessions = new Set<number>();
  for (let i = last + 1; i < used.length; i++) {
    if (!used[i]) continue;
    sessions.add(watch.line.seen[i]!.session);
    if (sessions.size === 2) return i;
  }
  return null;
}
