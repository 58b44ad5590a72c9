/** Binary numbers as the shortest decimals that stand for them: 38.2 in 32 bits is 38.2 again. Not a number is no value. */

export function doubleText(value: number): string {
  if (Number.isNaN(value)) return '';
  if (!Number.isFinite(value)) return value > 0 ? 'inf' : '-inf';
  return `${value}`;
}

/** Nine digits tell every 32-bit number from its neighbours. */
export function singleText(value: number): string {
  if (!Number.isFinite(value)) return doubleText(value);
  for (let digits = 6; digits < 9; digits += 1) {
    const text = `${Number(value.toPrecision(digits))}`;
    if (Math.fround(Number(text)) === value) return text;
  }
  return `${Number(value.toPrecision(9))}`;
}
