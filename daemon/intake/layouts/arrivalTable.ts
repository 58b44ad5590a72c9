import type { ReceivedArrival } from '../../../detectors/arrival.ts';
import { mjdNumber, SECONDS_PER_DAY } from '../../../detectors/time/mjd.ts';
import { quoted } from '../../visibleText.ts';
import { ALL_COLUMNS, arrivalOf, type Column, isProblem, type RowProblem, TIME_COLUMNS } from '../arrivalFields.ts';
import { decimalOf, isBetween, sum } from '../decimal.ts';
import { FREQUENCY_UNITS, inUnit, TIME_UNITS, unitIn } from '../units.ts';
import { headerFault, ignoredColumns } from './tableHeader.ts';
import { mjdText } from './timeText.ts';

/**
 * A table whose columns have names, units and types of their own (FITS, VOTable), as arrivals. Besides the columns of every
 * layout it may hold `mjd_utc_fraction` or `mjd_tdb_fraction`: then the date is the sum of two columns, and no digit is lost in
 * a 64-bit number.
 */
export interface TypedColumn {
  readonly name: string;
  /** Empty where none is stated. */
  readonly unit: string;
  /** `text` and `whole` hold exactly what was written; `single` and `double` are binary numbers of 32 and 64 bits. */
  readonly type: 'text' | 'whole' | 'single' | 'double';
}

export interface ArrivalTable {
  /** Places of the columns that are read. */
  readonly used: readonly number[];
  readonly ignored: readonly string[];
  readonly warnings: readonly string[];
  /** `textAt`: what stands in a column of this row, empty for a null; null: unreadable text. */
  arrivalAt(textAt: (place: number) => string | null): ReceivedArrival | RowProblem;
}

export function arrivalTable(columns: readonly TypedColumn[]): ArrivalTable | { readonly fault: string } {
  const names = columns.map(({ name }) => name);
  const fault = headerFault(names) ?? columnFault(columns);
  if (fault !== null) return { fault };
  const places = new Map(KNOWN.flatMap((name) => (names.includes(name) ? [[name, names.indexOf(name)] as const] : [])));
  const times = TIME_COLUMNS.flatMap((column) => timeColumn(columns, column) ?? []);
  return {
    used: [...places.values()],
    ignored: ignoredColumns(names, KNOWN),
    warnings: [...times.flatMap(coarseWarning), ...columns.flatMap(unitWarning)],
    arrivalAt: (textAt) => arrivalIn(textAt, { columns, places, times }),
  };
}

const fractionOf = (column: string) => `${column}_fraction`;
const KNOWN: readonly string[] = [...ALL_COLUMNS, ...TIME_COLUMNS.map(fractionOf)];

/** What the unit of a column may be, and what our own is called. */
const UNITS = new Map([
  ['uncertainty_us', { units: TIME_UNITS, own: 'us' }],
  ['frequency_mhz', { units: FREQUENCY_UNITS, own: 'MHz' }],
]);

function columnFault(columns: readonly TypedColumn[]): string | null {
  for (const { name, unit, type } of columns) {
    const known = UNITS.get(name);
    if (known !== undefined && unit !== '' && unitIn(known.units, unit) === null) {
      return `the column ${name} has the unit ${quoted(unit)}; known: ${Object.keys(known.units).join(', ')}`;
    }
    const isTime = TIME_COLUMNS.some((column) => name === column || name === fractionOf(column));
    if (isTime && unit !== '' && unit !== 'd')
      return `the column ${name} has the unit ${quoted(unit)}; days are wanted`;
    if (isTime && type === 'single') return `the column ${name} holds 32-bit numbers, too coarse for an arrival time`;
    const whole = name.replace(/_fraction$/, '');
    if (isTime && whole !== name && !columns.some((column) => column.name === whole)) {
      return `the column ${name} stands there without ${whole}`;
    }
  }
  return null;
}

function unitWarning({ name, unit }: TypedColumn): string[] {
  const known = UNITS.get(name);
  if (known === undefined || unit === '') return [];
  const factor = unitIn(known.units, unit)!;
  const isOwn = factor.digits === 1n && factor.exponent === 0;
  return isOwn ? [] : [`the column ${name} states the unit ${unit}, and is read in it`];
}

interface TimeColumn {
  readonly column: 'mjd_utc' | 'mjd_tdb';
  readonly day: number;
  readonly fraction: number | null;
  /** All digits went through one 64-bit number. */
  readonly coarse: boolean;
}

function timeColumn(columns: readonly TypedColumn[], column: TimeColumn['column']): TimeColumn | null {
  const day = columns.findIndex(({ name }) => name === column);
  const fraction = columns.findIndex(({ name }) => name === fractionOf(column));
  if (day < 0) return null;
  return {
    column,
    day,
    fraction: fraction < 0 ? null : fraction,
    coarse: fraction < 0 && columns[day]!.type === 'double',
  };
}

function coarseWarning({ column, coarse }: TimeColumn): string[] {
  if (!coarse) return [];
  return [
    `the column ${column} is one 64-bit number, in steps of 0.63 µs; write it as text, or as two columns ${column} and ${fractionOf(column)}`,
  ];
}

interface Places {
  readonly columns: readonly TypedColumn[];
  readonly places: ReadonlyMap<string, number>;
  readonly times: readonly TimeColumn[];
}

function arrivalIn(
  textAt: (place: number) => string | null,
  { columns, places, times }: Places,
): ReceivedArrival | RowProblem {
  const texts = new Map<string, string>();
  for (const [name, place] of places) {
    const text = textAt(place);
    if (text === null) return { column: isColumn(name) ? name : null, reason: 'is not UTF-8 text' };
    const unit = UNITS.get(name);
    const factor = unit === undefined ? null : unitIn(unit.units, columns[place]!.unit);
    texts.set(name, factor === null ? text : inUnit(text, factor));
  }
  for (const { column, fraction } of times) {
    if (fraction === null) continue;
    const whole = dateOfTwo(texts.get(column)!, texts.get(fractionOf(column))!);
    if (typeof whole !== 'string') return { column, reason: whole.reason };
    texts.set(column, whole);
  }
  const arrival = arrivalOf((column) => texts.get(column) ?? '');
  if (isProblem(arrival)) return arrival;
  const time = times.find(({ column }) => column === (arrival.timeScale === 'UTC' ? 'mjd_utc' : 'mjd_tdb'));
  const stepUs = time?.coarse ? stepOfDoubleUs(mjdNumber(arrival.time)) : 0;
  if (arrival.uncertaintyUs >= stepUs) return arrival;
  const reason = `is smaller than ${stepUs.toFixed(2)} µs, the step of a date in one 64-bit number: the digits of the time are lost`;
  return { column: 'uncertainty_us', reason };
}

function isColumn(name: string): name is Column {
  return (ALL_COLUMNS as readonly string[]).includes(name);
}

/** A whole or half day, and a part of at most one day before or after it. */
function dateOfTwo(day: string, fraction: string): string | { readonly reason: string } {
  if (day === '' && fraction === '') return '';
  const [whole, part] = [decimalOf(day), decimalOf(fraction)];
  if (whole === null) return { reason: `${quoted(day)} is not a date in digits` };
  if (part === null) return { reason: `with the fraction ${quoted(fraction)}: that is not a decimal number` };
  if (!/^[0-9]+(?:\.(?:0*|50*))?$/.test(day))
    return { reason: `${quoted(day)} with a fraction of its own: a whole day is wanted` };
  if (!isBetween(part, -1n, 1n))
    return { reason: `with the fraction ${quoted(fraction)}: it must be between -1 and 1` };
  return mjdText(sum(whole, part));
}

/** The distance between neighbouring 64-bit numbers at a date, as a time. */
function stepOfDoubleUs(mjd: number): number {
  return 2 ** (Math.floor(Math.log2(mjd)) - 52) * SECONDS_PER_DAY * 1e6;
}
