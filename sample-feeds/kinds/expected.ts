import { GLITCHES_OF_KINDS, type Kind, PULSARS_OF_KINDS } from './pulsars.ts';

/** The right answers, from what was planted alone; the program's own output has no part in them. */
export interface ExpectedOfKinds {
  readonly pulsars: readonly { readonly pulsar: string; readonly kind: Kind }[];
  /** Must be confirmed, each once, and nothing else. */
  readonly glitches: readonly {
    readonly pulsar: string;
    readonly explanation: 'glitch' | 'spin-down glitch';
    readonly epochMjd: number;
    readonly epochWithinDays: number;
    readonly deltaNuOverNu: number;
    /** As a fraction of it. */
    readonly sizeWithin: number;
  }[];
}

export function expectedOfKinds(): ExpectedOfKinds {
  return {
    pulsars: PULSARS_OF_KINDS.map(({ name, kind }) => ({ pulsar: name, kind })),
    glitches: GLITCHES_OF_KINDS.map(({ pulsar, epochMjd, deltaNuOverNu }) => ({
      pulsar,
      explanation: deltaNuOverNu > 0 ? 'glitch' : 'spin-down glitch',
      epochMjd,
      // It lies between two arrivals.
      epochWithinDays: Math.max(...ofPulsar(pulsar).programme.map(({ everyNights }) => everyNights)),
      deltaNuOverNu,
      sizeWithin: deltaNuOverNu > 0 ? 0.03 : 0.15,
    })),
  };
}

function ofPulsar(name: string) {
  return PULSARS_OF_KINDS.find((pulsar) => pulsar.name === name)!;
}
