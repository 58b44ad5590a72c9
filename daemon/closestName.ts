const SHORTEST_BEGINNING = 3;

/** The known name that a mistyped one most likely meant; null when none is near. */
export function closestName(typed: string, known: readonly string[]): string | null {
  const wanted = typed.toLowerCase();
  const begun =
    wanted.length < SHORTEST_BEGINNING ? undefined : known.find((name) => name.toLowerCase().startsWith(wanted));
  if (begun !== undefined) return begun;
  let best: string | null = null;
  let bestDistance = Math.max(2, Math.floor(wanted.length / 2)) + 1;
  for (const name of known) {
    const distance = editDistance(wanted, name.toLowerCase());
    if (distance < bestDistance) {
      best = name;
      bestDistance = distance;
    }
  }
  return best;
}

/** Least number of letters inserted, removed or replaced that turns one word into the other (Levenshtein 1966). */
export function editDistance(from: string, to: string): number {
  let previous = Array.from({ length: to.length + 1 }, (_, index) => index);
  for (let row = 1; row <= from.length; row += 1) {
    const current = [row];
    for (let column = 1; column <= to.length; column += 1) {
      const replaced = previous[column - 1]! + (from[row - 1] === to[column - 1] ? 0 : 1);
      current.push(Math.min(replaced, previous[column]! + 1, current[column - 1]! + 1));
    }
    previous = current;
  }
  return previous[to.length]!;
}
