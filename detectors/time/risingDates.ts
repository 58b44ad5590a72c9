/** Index of the first date later than `at` in a table whose dates never fall; its length when there is none. */
export function firstAfter(rising: ArrayLike<number>, at: number): number {
  let low = 0;
  let high = rising.length;
  while (low < high) {
    const middle = (low + high) >>> 1;
    if (rising[middle]! > at) high = middle;
    else low = middle + 1;
  }
  return low;
}
