import { uniformFloat64 } from 'pure-rand/distribution/uniformFloat64';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';

/** All chance in the sample feeds comes from this one number. */
export const SEED = 60_600_400;

export interface Chance {
  /** Evenly in [0, 1). */
  even(): number;
  /** Normal, mean 0, standard deviation 1. */
  normal(): number;
}

/** A stream of its own for each purpose, so that a change in one leaves the others as they were. */
export function chance(purpose: string): Chance {
  const generator = xoroshiro128plus(SEED ^ textHash(purpose));
  const even = () => uniformFloat64(generator);
  // Box & Muller 1958, Ann. Math. Stat. 29, 610; 1 − u keeps the logarithm finite.
  return { even, normal: () => Math.sqrt(-2 * Math.log(1 - even())) * Math.cos(2 * Math.PI * even()) };
}

/** FNV-1a, 32 bits. */
function textHash(text: string): number {
  let hash = 0x811c9dc5;
  for (const byte of new TextEncoder().encode(text)) hash = Math.imul(hash ^ byte, 0x01000193);
  return hash;
}
