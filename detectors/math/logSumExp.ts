/** ln Σ exp(xᵢ) without overflow; −Infinity for an empty list. `count` limits the sum to the first entries. */
export function logSumExp(values: ArrayLike<number>, count = values.length): number {
  let largest = Number.NEGATIVE_INFINITY;
  for (let i = 0; i < count; i++) if (values[i]! > largest) largest = values[i]!;
  if (!Number.isFinite(largest)) return largest;
  let sum = 0;
  for (let i = 0; i < count; i++) sum += Math.exp(values[i]! - largest);
  return largest + Math.log(sum);
}

/** ln(eᵃ + eᵇ). */
export function logAddExp(a: number, b: number): number {
  if (a === Number.NEGATIVE_INFINITY) return b;
  if (b === Number.NEGATIVE_INFINITY) return a;
  return a > b ? a + Math.log1p(Math.exp(b - a)) : b + Math.log1p(Math.exp(a - b));
}

/** ln(eᵃ / eᵇ); −Infinity where there is nothing above the line, be there something below it or not. */
export function logRatio(a: number, b: number): number {
  return a === Number.NEGATIVE_INFINITY ? a : a - b;
}
