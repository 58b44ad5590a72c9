import { isConstrained, NOT_CONSTRAINED, superscript } from '../../../alerts/wording/numbers.ts';
import type { Interval, PulsarEvent } from '../../../detectors/steps/pulsarEvent.ts';
import { type Column, type Html, table } from './layout.ts';
import { ABSENT } from './wording.ts';

/** All that was measured of an event, with both intervals. What the data do not constrain says so. */
export function intervalTable(event: PulsarEvent): Html {
  return table({
    caption: 'Measured values',
    columns: COLUMNS,
    rows: measuredValues(event),
    empty: 'Nothing is measured yet.',
  });
}

interface Measured {
  readonly name: string;
  readonly unit: string;
  readonly value: number | null;
  /** Undefined: from before it was kept. */
  readonly interval68: Interval | null | undefined;
  readonly interval95: Interval | null | undefined;
  /** Not a size, so that zero is a value like any other. */
  readonly isTime?: true;
}

function measuredValues(event: PulsarEvent): Measured[] {
  const epoch = of('Epoch', 'MJD', event.epochMjd, event.epochInterval68, event.epochInterval95);
  const rows: Measured[] = [{ ...epoch, isTime: true }];
  if (event.timeStepUs !== null) rows.push(of('Time step', 'µs', event.timeStepUs, event.timeStepUsInterval68));
  const hasSpin = event.deltaNuHz !== null || event.deltaNuOverNu !== null || event.deltaNuDot !== null;
  return hasSpin ? [...rows, ...spinRows(event), ...recoveryRows(event)] : rows;
}

function spinRows(e: PulsarEvent): Measured[] {
  const dotRatio = e.deltaNuDotOverNuDotInterval68;
  return [
    of('Δν', 'Hz', e.deltaNuHz, e.deltaNuHzInterval68, e.deltaNuHzInterval95),
    of('Δν/ν', '', e.deltaNuOverNu, e.deltaNuOverNuInterval68, e.deltaNuOverNuInterval95),
    of('Δν̇', 'Hz/s', e.deltaNuDot, e.deltaNuDotInterval68, e.deltaNuDotInterval95),
    of('Δν̇/ν̇', '', e.deltaNuDotOverNuDot, dotRatio, e.deltaNuDotOverNuDotInterval95),
    ...(e.riseDays == null ? [] : [of('Rise', 'd', e.riseDays, e.riseDaysInterval68)]),
  ];
}

function recoveryRows({ recovery }: PulsarEvent): Measured[] {
  const rows = recovery.terms.flatMap((t, i) => {
    const number = recovery.terms.length > 1 ? ` ${i + 1}` : '';
    const name = `${t.kind === 'delayed rise' ? 'Delayed rise' : 'Recovery'}${number}`;
    return [
      of(`${name}: Δνⱼ/Δν`, '', t.fraction, t.fractionInterval68, t.fractionInterval95),
      of(`${name}: τ`, 'd', t.timescaleDays, t.timescaleDaysInterval68, t.timescaleDaysInterval95),
    ];
  });
  return [...rows, of('Recovered in all, Q', '', recovery.q, recovery.qInterval68, recovery.qInterval95)];
}

function of(
  name: string,
  unit: string,
  value: number | null,
  interval68: Interval | null | undefined,
  interval95?: Interval | null,
): Measured {
  return { name, unit, value, interval68, interval95 };
}

const COLUMNS: readonly Column<Measured>[] = [
  { head: 'Quantity', cell: (row) => row.name },
  {
    head: 'Value',
    cell: (row) => (row.isTime || isConstrained(row.value, row.interval68 ?? null) ? valueText(row) : NOT_CONSTRAINED),
    numeric: true,
  },
  { head: '68 % interval', cell: (row) => rangeText(row, row.interval68), numeric: true },
  { head: '95 % interval', cell: (row) => rangeText(row, row.interval95), numeric: true },
];

function valueText(row: Measured): string {
  if (row.value === null) return NOT_CONSTRAINED;
  return withUnit(row, fixed(row.value / scaleOf(row), decimalsOf(row)));
}

function rangeText(row: Measured, interval: Interval | null | undefined): string {
  if (interval === undefined) return ABSENT;
  if (interval === null) return row.value === null ? ABSENT : NOT_CONSTRAINED;
  if (!interval.every(Number.isFinite)) return NOT_CONSTRAINED;
  const [low, high] = interval.map((bound) => fixed(bound / scaleOf(row), decimalsOf(row)));
  return withUnit(row, `${low} to ${high}`);
}

/** One power of a thousand for the whole row, so that its numbers can be compared by eye. */
function exponentOf({ value, interval68, isTime }: Measured): number {
  const largest = Math.max(...[value ?? 0, ...(interval68 ?? [])].filter(Number.isFinite).map(Math.abs));
  if (isTime || largest === 0) return 0;
  const exponent = 3 * Math.floor(Math.log10(largest) / 3);
  return exponent === -3 && largest >= 0.1 ? 0 : exponent;
}

function scaleOf(row: Measured): number {
  return 10 ** exponentOf(row);
}

/** Two digits of the half-width of the 68 % interval; four digits where none is known. */
function decimalsOf(row: Measured): number {
  const half = row.interval68 == null ? 0 : (row.interval68[1] - row.interval68[0]) / 2 / scaleOf(row);
  if (half > 0 && Number.isFinite(half)) return bounded(1 - Math.floor(Math.log10(half)));
  const size = Math.abs((row.value ?? 0) / scaleOf(row));
  return size === 0 ? 0 : bounded(3 - Math.floor(Math.log10(size)));
}

function bounded(decimals: number): number {
  return Math.max(0, Math.min(12, decimals));
}

function fixed(value: number, decimals: number): string {
  const text = Math.abs(value).toFixed(decimals);
  return value < 0 && Number(text) !== 0 ? `−${text}` : text;
}

function withUnit(row: Measured, text: string): string {
  const exponent = exponentOf(row);
  const grouped = text.includes(' ') ? `(${text})` : text;
  const body = exponent === 0 ? text : `${grouped} × 10${superscript(exponent)}`;
  if (row.isTime) return `${row.unit} ${body}`;
  return row.unit === '' ? body : `${body} ${row.unit}`;
}
