/** From data to pixels, and where the ticks go. */
export interface Scale {
  readonly domain: readonly [number, number];
  readonly range: readonly [number, number];
}

export function place(scale: Scale, value: number): number {
  const [d0, d1] = scale.domain;
  const [r0, r1] = scale.range;
  return r0 + ((value - d0) / (d1 - d0)) * (r1 - r0);
}

/** The smallest domain that holds all values, with some air; never empty. */
export function domainOf(values: readonly number[], air: number): readonly [number, number] {
  const finite = values.filter(Number.isFinite);
  const low = Math.min(...finite);
  const high = Math.max(...finite);
  if (finite.length === 0) return [-1, 1];
  const width = high - low || Math.abs(high) * 0.1 || 1;
  return [low - air * width, high + air * width];
}

export interface Ticks {
  readonly values: readonly number[];
  readonly decimals: number;
}

/** At 1, 2 or 5 times a power of ten: about `wanted` of them, and at least three. */
export function ticksOf(domain: readonly [number, number], wanted: number): Ticks {
  let ticks = ticksAt(domain, wanted);
  for (let more = wanted + 1; ticks.values.length < 3 && more < 3 * wanted + 6; more++) ticks = ticksAt(domain, more);
  return ticks;
}

function ticksAt([low, high]: readonly [number, number], most: number): Ticks {
  const rough = (high - low) / Math.max(1, most);
  const decade = 10 ** Math.floor(Math.log10(rough));
  const step = ([1, 2, 5, 10].find((m) => m * decade >= rough * (1 - 1e-9)) ?? 10) * decade;
  const decimals = Math.max(0, Math.min(15, -Math.floor(Math.log10(step) + 1e-9)));
  const values: number[] = [];
  for (let k = Math.ceil(low / step - 1e-9); k * step <= high + 1e-9 * step; k++) values.push(k * step);
  return { values, decimals };
}

/** With a real minus sign, and no minus before zero. */
export function tickLabel(value: number, decimals: number): string {
  const text = Math.abs(value).toFixed(decimals);
  return value < 0 && Number(text) !== 0 ? `−${text}` : text;
}

/** Of the International System of Units (BIPM brochure, 9th edition, table 7). */
const PREFIXES = [
  [1, ''],
  [1e-3, 'm'],
  [1e-6, 'µ'],
  [1e-9, 'n'],
  [1e-12, 'p'],
] as const;

/** The power of a thousand, and the name of the unit with its prefix, in which values of this size read best. */
export function unitFor(largest: number, unit: string): readonly [factor: number, name: string] {
  const [factor, prefix] = PREFIXES.find(([least]) => largest >= least) ?? PREFIXES[4];
  return [factor, `${prefix}${unit}`];
}
