import type { PulsarEvent } from '../../detectors/steps/pulsarEvent.ts';
import { momentText } from './dates.ts';
import { percent, quantity } from './numbers.ts';
import { eventName } from './phrases.ts';
import { sizeText } from './sheet.ts';

/** One revision of an event: what was believed of it, and from when on. */
export interface Belief {
  readonly revision: number;
  /** ISO 8601 UTC */
  readonly at: string;
  readonly what: string;
  /** In words, whether it was mailed and why; absent or null: not known. */
  readonly alert?: string | null;
  readonly event: PulsarEvent;
}

/** The numbers of a revision in one line: `candidate glitch, 99.8 %, Δν/ν = …, Δν̇/ν̇ = …, Q = …, from 42 arrivals`. */
export function beliefText({ event }: Belief): string {
  const { deltaNuDotOverNuDot, deltaNuDotOverNuDotInterval68, recovery } = event;
  const own = event.explanations[event.explanation];
  const power = { unit: '', scale: 'power' } as const;
  const torque = quantity({ value: deltaNuDotOverNuDot, interval68: deltaNuDotOverNuDotInterval68, ...power });
  const terms = recovery.terms.map(({ fraction, fractionInterval68 }) =>
    quantity({ value: fraction, interval68: fractionInterval68, ...power }),
  );
  return [
    own === undefined ? eventName(event) : `${eventName(event)}, ${percent(own)}`,
    sizeText(event),
    deltaNuDotOverNuDot === null ? '' : `Δν̇/ν̇ ${torque}`,
    terms.length === 0 ? '' : `Q ${terms.join(' and ')}`,
    `from ${event.arrivalsUsed} arrivals`,
  ]
    .filter((part) => part !== '')
    .join(', ');
}

/** What was believed when, oldest first: one line a revision, with why it was mailed or not. */
export function historyLines(history: readonly Belief[]): string[] {
  return history.map((belief) => {
    const alert = belief.alert ? ` (${belief.alert})` : '';
    return `${momentText(new Date(belief.at), 'UTC')}, revision ${belief.revision}: ${belief.what}${alert}. ${beliefText(belief)}`;
  });
}
