/** The upper median; NaN of an empty list. */
export function median(values: readonly number[]): number {
  if (values.length === 0) return Number.NaN;
  return [...values].sort((a, b) => a - b)[values.length >> 1]!;
}
