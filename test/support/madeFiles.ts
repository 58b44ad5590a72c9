/** Another machine's sine may differ in its last bit: the 13th decimal of a day (9 ns) may be off by two. */
export function sameButForTheLastDigit(a: string, b: string): boolean {
  if (a === b) return true;
  const DIGITS = /\d{5}\.\d{13}/g;
  if (a.replace(DIGITS, '#') !== b.replace(DIGITS, '#')) return false;
  const theirs = b.match(DIGITS) ?? [];
  return (a.match(DIGITS) ?? []).every((mine, i) => {
    const difference = BigInt(mine.replace('.', '')) - BigInt(theirs[i]!.replace('.', ''));
    return difference >= -2n && difference <= 2n;
  });
}
