/** Repeatable random numbers: the same text gives the same stream, on every machine. */

export interface RandomStream {
  /** In [0, 1). */
  uniform(): number;
  normal(): number;
}

/** Seeded by the FNV-1a hash of a text (IETF draft-eastlake-fnv); xorshift of 32 bits (Marsaglia 2003, J. Stat. Softw. 8(14)). */
export function randomStream(text: string): RandomStream {
  let state = fnv1a(text) || 1;
  const uniform = (): number => {
    state ^= state << 13;
    state ^= state >>> 17;
    state ^= state << 5;
    return (state >>> 0) / 4_294_967_296;
  };
  // Box and Muller 1958; 1 − u keeps the logarithm finite.
  const normal = (): number => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
  return { uniform, normal };
}

/** The 32-bit hash: published test value fnv1a('foobar') = 0xbf9cf968. */
export function fnv1a(text: string): number {
  let hash = 0x811c9dc5;
  for (let i = 0; i < text.length; i++) {
    hash ^= text.charCodeAt(i) & 0xff;
    hash = Math.imul(hash, 0x01000193);
  }
  return hash >>> 0;
}
