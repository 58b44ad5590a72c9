import type { Interval } from '../../detectors/steps/pulsarEvent.ts';

/** Numbers as a person reads them: rounded to what is known, with a real minus sign and an uncertainty in the same unit. */

export const NOT_CONSTRAINED = 'not yet constrained';

const MINUS = '\u2212';
const SUPERSCRIPTS = '⁰¹²³⁴⁵⁶⁷⁸⁹';
const PREFIXES: Readonly<Record<number, string>> = {
  [-12]: 'p',
  [-9]: 'n',
  [-6]: 'µ',
  [-3]: 'm',
  0: '',
  3: 'k',
  6: 'M',
};

export interface Quantity {
  readonly value: number | null;
  readonly interval68: Interval | null;
  /** `''` for a pure number. */
  readonly unit: string;
  /** `prefix`: 20.3 nHz; `power`: 2.03 × 10⁻⁸ Hz, always in steps of a thousand, so that sizes line up by eye. */
  readonly scale: 'prefix' | 'power';
}

/**
 * `(3.2 ± 0.2) × 10⁻⁹`, `20.3 ± 0.5 nHz`, `(12 +3 −2) × 10⁻³`. Without a value, or when the 68 % interval holds zero, the
 * sign is not known: `not yet constrained`, and the interval in brackets where there is one.
 */
export function quantity(q: Quantity): string {
  if (q.value === null || !Number.isFinite(q.value)) return NOT_CONSTRAINED;
  if (q.interval68 === null) return `${withUnit(significant(q.value, q), q)} (uncertainty not known)`;
  const [low, high] = q.interval68;
  if (!Number.isFinite(low) || !Number.isFinite(high)) return NOT_CONSTRAINED;
  if (low === high) return withUnit(significant(q.value, q), q);
  if (low <= 0 && high >= 0) return `${NOT_CONSTRAINED} (${between(q.interval68, q)})`;
  return withUnit(withUncertainty(q.value, q.interval68, q), q);
}

/** True when `quantity` would state a value. */
export function isConstrained(value: number | null, interval: Interval | null): boolean {
  return value !== null && Number.isFinite(value) && (interval === null || interval[0] > 0 || interval[1] < 0);
}

/** A number without uncertainty, to so many significant digits: `6.3418`. */
export function plain(value: number, digits: number): string {
  if (!Number.isFinite(value)) return value === Infinity ? 'infinite' : 'not known';
  const decimals = Math.max(0, Math.min(20, digits - 1 - decadeOf(value)));
  return signed(value, decimals);
}

/** `0.9998` → `99.98 %`; never `100 %`. */
export function percent(probability: number): string {
  if (probability > 0.9999) return '> 99.99 %';
  if (probability < 0.0001) return '< 0.01 %';
  const p = probability * 100;
  return `${p.toFixed(p >= 99 || p < 1 ? 2 : p >= 90 ? 1 : 0)} %`;
}

interface Scaled {
  readonly body: string;
  readonly exponent: number;
  readonly compound: boolean;
}

function withUncertainty(value: number, [low, high]: Interval, q: Quantity): Scaled {
  const up = Math.max(0, high - value);
  const down = Math.max(0, value - low);
  const exponent = exponentFor(value, Math.max(up, down), q);
  const factor = 10 ** -exponent;
  const symmetric = Math.abs(up - down) <= 0.15 * Math.max(up, down);
  const errors = symmetric ? [((up + down) / 2) * factor] : [up * factor, down * factor];
  const decimals = Math.max(...errors.filter((e) => e > 0).map(decimalsFor), 0);
  const texts = errors.map((e) => e.toFixed(decimals));
  const body = symmetric
    ? `${signed(value * factor, decimals)} ± ${texts[0]}`
    : `${signed(value * factor, decimals)} +${texts[0]} ${MINUS}${texts[1]}`;
  return { body, exponent, compound: true };
}

/**
 * How many decimals an uncertainty is worth, by the rounding rule of the Particle Data Group (Review of Particle Physics, Introduction,
 * "Rounding", from memory): three leading digits 100–354 keep two digits, 355–949 keep one, 950–999 become 1000 and keep two.
 */
function decimalsFor(uncertainty: number): number {
  const decade = decadeOf(uncertainty);
  const leading = Math.round(uncertainty / 10 ** (decade - 2));
  const digits = leading <= 354 ? 2 : 1;
  return Math.max(0, Math.min(15, digits - 1 - decade));
}

function between([low, high]: Interval, q: Quantity): string {
  const exponent = exponentFor(Math.max(Math.abs(low), Math.abs(high)), 0, q);
  const decimals = Math.max(0, Math.min(15, 1 - decadeOf((high - low) / 10 ** exponent)));
  const body = `${signed(low / 10 ** exponent, decimals)} to ${signed(high / 10 ** exponent, decimals, '+')}`;
  return `68 %: ${withUnit({ body, exponent, compound: true }, q)}`;
}

function significant(value: number, q: Quantity): Scaled {
  const exponent = exponentFor(value, 0, q);
  return { body: plain(value / 10 ** exponent, 3), exponent, compound: false };
}

function withUnit({ body, exponent, compound }: Scaled, q: Quantity): string {
  const unit = q.unit === '' ? '' : ` ${q.unit}`;
  if (q.scale === 'prefix') return `${body} ${PREFIXES[exponent] ?? ''}${q.unit}`.trimEnd();
  if (exponent === 0) return `${body}${unit}`;
  return `${compound ? `(${body})` : body} × 10${superscript(exponent)}${unit}`;
}

/** The power of a thousand in which the value reads as 1 to 999. */
function exponentFor(value: number, uncertainty: number, q: Quantity): number {
  const size = Math.max(Math.abs(value), uncertainty);
  if (size === 0) return 0;
  const exponent = 3 * Math.floor(decadeOf(size) / 3);
  return q.scale === 'prefix' ? Math.max(-12, Math.min(6, exponent)) : exponent === -3 && size >= 0.1 ? 0 : exponent;
}

function decadeOf(value: number): number {
  if (value === 0) return 0;
  return Number(value.toExponential(12).split('e')[1]);
}

function signed(value: number, decimals: number, plus: '' | '+' = ''): string {
  const text = Math.abs(value).toFixed(decimals);
  if (Number(text) === 0) return text;
  return `${value < 0 ? MINUS : plus}${text}`;
}

/** `10` to this power, typeset: `⁻⁹`. */
export function superscript(exponent: number): string {
  return String(exponent).replace(/./g, (c) => (c === '-' ? '⁻' : (SUPERSCRIPTS[Number(c)] ?? c)));
}

/** A pure number without uncertainty in powers of a thousand, two digits: `2.1 × 10⁻⁹`. */
export function power(value: number): string {
  const q: Quantity = { value, interval68: null, unit: '', scale: 'power' };
  const exponent = exponentFor(value, 0, q);
  return withUnit({ body: plain(value / 10 ** exponent, 2), exponent, compound: false }, q);
}
