export interface DescentSettings {
  /** Step of the difference quotients. */
  readonly differenceStep: number;
  /** Longest step taken at once. */
  readonly longestStep: number;
  /** Stop when a whole step gains less than this. */
  readonly tolerance: number;
  readonly maxSteps: number;
}

export interface Minimum {
  readonly point: Float64Array;
  readonly value: number;
  readonly evaluations: number;
}

/**
 * Minimises a smooth `f` of a few variables, scaled so that its curvature is near 1 or above: quasi-Newton steps with
 * the inverse Hessian of Broyden, Fletcher, Goldfarb and Shanno (1970), forward differences (the minimum is right to half their step), shorter steps where
 * needed. Deterministic. `f` must not keep its argument.
 */
export function minimise(
  f: (point: Float64Array) => number,
  start: ArrayLike<number>,
  settings: DescentSettings,
): Minimum {
  const n = start.length;
  let evaluations = 0;
  const valueAt = (point: Float64Array): number => {
    evaluations += 1;
    return f(point);
  };
  const gradientAt = (at: Float64Array, valueThere: number): Float64Array => {
    const gradient = new Float64Array(n);
    for (let i = 0; i < n; i++) {
      const probe = Float64Array.from(at);
      probe[i] = probe[i]! + settings.differenceStep;
      gradient[i] = (valueAt(probe) - valueThere) / settings.differenceStep;
    }
    return gradient;
  };
  let point = Float64Array.from(start);
  let value = valueAt(point);
  let gradient = gradientAt(point, value);
  let inverse = identity(n);
  for (let k = 0; k < settings.maxSteps; k++) {
    let step = times(inverse, gradient).map((x) => -x);
    if (dot(step, gradient) >= 0) {
      inverse = identity(n);
      step = gradient.map((x) => -x);
    }
    const length = Math.hypot(...step);
    let share = Math.min(1, settings.longestStep / Math.max(length, 1e-300));
    let next = point.map((x, i) => x + share * step[i]!);
    let nextValue = valueAt(next);
    const slope = dot(step, gradient);
    // A step must gain a little of what the slope promises (Armijo 1966).
    for (let halving = 0; halving < 8 && !(nextValue <= value + 1e-4 * share * slope); halving++) {
      share *= 0.4;
      next = point.map((x, i) => x + share * step[i]!);
      nextValue = valueAt(next);
    }
    if (!(nextValue < value)) break;
    const gain = value - nextValue;
    const nextGradient = gradientAt(next, nextValue);
    updateInverse(
      inverse,
      next.map((x, i) => x - point[i]!),
      nextGradient.map((x, i) => x - gradient[i]!),
    );
    point = next;
    value = nextValue;
    gradient = nextGradient;
    if (gain < settings.tolerance) break;
  }
  return { point, value, evaluations };
}

/** H ← (I − ρ s yᵀ) H (I − ρ y sᵀ) + ρ s sᵀ, left alone where the curvature along s is not positive. */
function updateInverse(inverse: Float64Array, s: Float64Array, y: Float64Array): void {
  const n = s.length;
  const curvature = dot(s, y);
  if (!(curvature > 1e-10 * Math.hypot(...s) * Math.hypot(...y))) return;
  const rho = 1 / curvature;
  const hy = times(inverse, y);
  const factor = rho * (1 + rho * dot(y, hy));
  for (let i = 0; i < n; i++) {
    for (let j = 0; j < n; j++) {
      const change = factor * s[i]! * s[j]! - rho * (hy[i]! * s[j]! + s[i]! * hy[j]!);
      inverse[i * n + j] = inverse[i * n + j]! + change;
    }
  }
}

function identity(n: number): Float64Array {
  return Float64Array.from({ length: n * n }, (_, k) => (k % (n + 1) === 0 ? 1 : 0));
}

function times(matrix: Float64Array, x: Float64Array): Float64Array {
  const n = x.length;
  return x.map((_, i) => {
    let sum = 0;
    for (let j = 0; j < n; j++) sum += matrix[i * n + j]! * x[j]!;
    return sum;
  });
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i++) sum += a[i]! * b[i]!;
  return sum;
}
