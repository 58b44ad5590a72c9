/** Settings of one minimisation. */
export interface SimplexSettings {
  /** First steps along each coordinate; they set the scale of the search. */
  readonly steps: readonly number[];
  /** Stop when the simplex spans less than this in value. */
  readonly tolerance: number;
  readonly maxEvaluations: number;
}

export interface Minimum {
  readonly point: Float64Array;
  readonly value: number;
  readonly evaluations: number;
}

interface Corner {
  readonly point: Float64Array;
  value: number;
}

/**
 * Minimises `f` without derivatives by the simplex method of Nelder & Mead 1965 (Computer J. 7, 308): deterministic, and
 * content with a function that is only piecewise smooth. `f` must not keep its argument.
 */
export function nelderMead(
  f: (point: Float64Array) => number,
  start: ArrayLike<number>,
  settings: SimplexSettings,
): Minimum {
  const n = start.length;
  const corners: Corner[] = Array.from({ length: n + 1 }, (_, corner) => {
    const point = Float64Array.from(start);
    if (corner > 0) point[corner - 1] = point[corner - 1]! + settings.steps[corner - 1]!;
    return { point, value: f(point) };
  });
  let evaluations = n + 1;
  const centre = new Float64Array(n);
  const trial = (towards: number): Corner => {
    const worst = corners[n]!.point;
    const point = centre.map((c, i) => c + towards * (worst[i]! - c));
    evaluations += 1;
    return { point, value: f(point) };
  };
  while (evaluations < settings.maxEvaluations) {
    corners.sort((a, b) => a.value - b.value);
    const best = corners[0]!;
    const worst = corners[n]!;
    if (worst.value - best.value < settings.tolerance) break;
    centre.fill(0);
    for (let c = 0; c < n; c++) for (let i = 0; i < n; i++) centre[i] = centre[i]! + corners[c]!.point[i]! / n;
    const reflected = trial(-1);
    if (reflected.value < best.value) {
      const expanded = trial(-2);
      corners[n] = expanded.value < reflected.value ? expanded : reflected;
    } else if (reflected.value < corners[n - 1]!.value) {
      corners[n] = reflected;
    } else {
      const contracted = trial(reflected.value < worst.value ? -0.5 : 0.5);
      if (contracted.value < Math.min(reflected.value, worst.value)) corners[n] = contracted;
      else {
        for (let c = 1; c <= n; c++) {
          const corner = corners[c]!;
          for (let i = 0; i < n; i++) corner.point[i] = 0.5 * (corner.point[i]! + best.point[i]!);
          corner.value = f(corner.point);
          evaluations += 1;
        }
      }
    }
  }
  corners.sort((a, b) => a.value - b.value);
  const { point, value } = corners[0]!;
  return { point, value, evaluations };
}
