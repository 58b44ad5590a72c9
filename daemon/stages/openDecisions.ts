import type { Store } from '../store/index.ts';

/**
 * Pulsars with arrivals on record that no decision has seen yet, because many files are taken in before one decision. They are
 * named on record before such arrivals are, and struck off after the decision is: a crash in between costs a decision taken twice.
 */
const OPEN_DECISIONS = 'open_decisions';

export function openDecisions(store: Store): readonly string[] {
  return JSON.parse(store.meta(OPEN_DECISIONS) ?? '[]') as string[];
}

export function noteOpen(store: Store, pulsars: readonly string[]): void {
  const open = new Set(openDecisions(store));
  if (pulsars.every((pulsar) => open.has(pulsar))) return;
  write(store, [...open, ...pulsars]);
}

export function noteDecided(store: Store, pulsars: readonly string[]): void {
  const open = openDecisions(store);
  const left = open.filter((pulsar) => !pulsars.includes(pulsar));
  if (left.length < open.length) write(store, left);
}

function write(store: Store, pulsars: readonly string[]): void {
  store.setMeta(OPEN_DECISIONS, JSON.stringify([...new Set(pulsars)].sort()));
}
