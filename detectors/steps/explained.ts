/** What an event is called, and the probability of each explanation: they sum to 1, and what was weighed is named, be it 0. */

import type { Estimate } from '../recovery/mixture.ts';
import { KINDS } from './births.ts';
import type { Explanation } from './pulsarEvent.ts';
import { shareBelowZero } from './signPrior.ts';
import { isSlow } from './slowSpinUp.ts';
import type { Track } from './track.ts';

/** Weighed of every event; a slow spin-up and mode switching are weighed once it is confirmed. */
const ALWAYS_WEIGHED = [...KINDS, 'spin-down glitch', 'bad arrival', 'bad session', 'lost count', 'wandering'];

export interface Explained {
  readonly explanation: Explanation;
  readonly explanations: Readonly<Record<string, number>>;
}

/** `deltaNu`: the step in frequency, where one was measured. */
export function explained(track: Track, deltaNu: Estimate | null): Explained {
  const negative = deltaNu === null ? 0 : shareBelowZero(deltaNu);
  const shares = signed(asWhole(track), negative);
  const total = Object.values(shares).reduce((sum, share) => sum + share, 0);
  const explanations: Record<string, number> = {};
  for (const name of ALWAYS_WEIGHED) explanations[name] = 0;
  for (const [name, share] of Object.entries(shares)) explanations[name] = total > 0 ? share / total : 0;
  return { explanation: nameOf(track, negative), explanations };
}

function nameOf(track: Track, negative: number): Explanation {
  if (track.modes !== null) return 'mode switching';
  if (isSlow(track)) return 'slow spin-up';
  return negative > 0.5 ? 'spin-down glitch' : track.kind;
}

/** Of the weight of steps in ν and ν̇, what belongs to a slow rise or to switches stands under its own name. */
function asWhole({ explanations, shapes, modes }: Track): Readonly<Record<string, number>> {
  const { glitch = 0, 'spin-down-rate change': change = 0, ...rest } = explanations;
  if (modes !== null)
    return {
      ...rest,
      glitch,
      'spin-down-rate change': change * (1 - modes.share),
      'mode switching': change * modes.share,
    };
  if (shapes === null) return explanations;
  const slow = shapes.shares['slow spin-up'] ?? 0;
  return {
    ...rest,
    glitch: glitch * (1 - slow),
    'spin-down-rate change': change * (1 - slow),
    'slow spin-up': (glitch + change) * slow,
  };
}

/** Of the weight of a step in ν, the share that is a spin-down stands under its own name. */
function signed(explanations: Readonly<Record<string, number>>, negative: number): Record<string, number> {
  const { glitch = 0, ...rest } = explanations;
  return { ...rest, glitch: glitch * (1 - negative), 'spin-down glitch': glitch * negative };
}
