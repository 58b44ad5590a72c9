/** Repeatable normal numbers: the same stream always, so that a limit is a function of the record alone. */

/** 32-bit mixing of a counter by a Weyl sequence (Marsaglia 2003, J. Stat. Softw. 8(14), for the idea of xorshift mixing). */
export function normalStream(seed: number): () => number {
  let counter = seed | 0;
  const uniform = (): number => {
    counter = (counter + 0x6d2b79f5) | 0;
    let mixed = Math.imul(counter ^ (counter >>> 15), counter | 1);
    mixed ^= mixed + Math.imul(mixed ^ (mixed >>> 7), mixed | 61);
    return ((mixed ^ (mixed >>> 14)) >>> 0) / 4_294_967_296;
  };
  // Box and Muller 1958; 1 − u keeps the logarithm finite.
  return () => Math.sqrt(-2 * Math.log(1 - uniform())) * Math.cos(2 * Math.PI * uniform());
}
