import { basename } from 'node:path';
import type { ReceivedArrival } from '../../../detectors/arrival.ts';
import type { LeapSecondTable } from '../../../detectors/time/leapSeconds.ts';
import { quoted } from '../../visibleText.ts';
import { arrivalOf, type Column, isProblem, type RowProblem } from '../arrivalFields.ts';
import { decimalOf, decimalText, product } from '../decimal.ts';
import { type ArrivalFile, faulty, SortedRows } from '../rows.ts';
import { FREQUENCY_UNITS, TIME_UNITS, unitIn } from '../units.ts';
import { matchFileName } from './fileNamePattern.ts';
import { textLines } from './lines.ts';
import { giveUpCutRow, textBody } from './textBytes.ts';
import type { NamedSource, Placeholder, Source, TextColumns } from './textColumns.ts';
import { timeOfColumns } from './timeOfColumns.ts';

/** Layout `columns`: any text table, one arrival a line, as the feed's configuration describes it. */
export function readColumns(
  received: Buffer,
  columns: TextColumns,
  { path, leapSeconds }: { readonly path: string; readonly leapSeconds: LeapSecondTable },
): ArrivalFile {
  const body = textBody(received);
  if ('fault' in body) return faulty(body.fault);
  if (body.bytes.subarray(0, 1024).includes(0)) return faulty('is not a text table: it holds zero bytes');
  const name = basename(path);
  const fromName = columns.fileName === null ? NO_NAMES : matchFileName(columns.fileName, name);
  if (fromName === null) return faulty(`its name ${quoted(name)} does not fit the pattern in the feed's file_name`);

  const sorted = new SortedRows();
  for (const { line, text, problem } of textLines(body.bytes)) {
    if (line <= columns.skipLines || (text !== null && isPassedOver(text, columns))) continue;
    const row = text === null ? { column: null, reason: problem } : rowOf(text, { columns, fromName, leapSeconds });
    const fault = sorted.add(line, row);
    if (fault !== null) return faulty(fault);
  }
  if (body.zeros > 0) giveUpCutRow(body, sorted);
  const { rows, rejects } = sorted;
  return { rows, rejects, fault: null, unterminated: body.open && body.zeros === 0, ignoredColumns: [], warnings: [] };
}

const NO_NAMES: ReadonlyMap<Placeholder, string> = new Map();

interface RowContext {
  readonly columns: TextColumns;
  /** What the file's name says. */
  readonly fromName: ReadonlyMap<Placeholder, string>;
  readonly leapSeconds: LeapSecondTable;
}

/** Blank lines and comments. */
function isPassedOver(text: string, { commentMarks }: TextColumns): boolean {
  const begun = text.replace(/^[ \t]+/, '');
  return begun === '' || commentMarks.some((mark) => begun.startsWith(mark));
}

function rowOf(text: string, context: RowContext): ReceivedArrival | RowProblem {
  const { columns } = context;
  const fields = fieldsOf(text, columns);
  if ('reason' in fields) return fields;
  const textAt = (source: Source) => textFrom(source, { text, fields, context });
  const time = timeOfColumns(columns.time, textAt, { ...context, exponentLetters: lettersOf(columns) });
  const timeColumn = columns.time.scale === 'UTC' ? 'mjd_utc' : 'mjd_tdb';
  if (typeof time !== 'string') return { column: timeColumn, reason: `${placeOf(columns.time.source)}${time.reason}` };
  const cells = new Map<Column, string>([[timeColumn, time]]);
  for (const [column, named] of namedSources(columns)) {
    const name = nameFrom(named, textAt(named.source));
    if (typeof name !== 'string') return { column, reason: `${placeOf(named.source)}${name.reason}` };
    cells.set(column, name);
  }
  for (const [column, source] of plainSources(columns)) cells.set(column, quantity(column, textAt(source), columns));
  const arrival = arrivalOf((column) => cells.get(column) ?? '');
  return isProblem(arrival) ? withPlace(arrival, columns) : arrival;
}

function fieldsOf(text: string, { separator, columnCount }: TextColumns): readonly string[] | RowProblem {
  if (separator === null) {
    // Where a tab ends depends on who looks at it.
    return text.includes('\t') ? { column: null, reason: 'holds a tab: its fixed positions cannot be told' } : [];
  }
  const fields =
    separator === 'blanks'
      ? text.replace(/^[ \t]+|[ \t]+$/g, '').split(/[ \t]+/)
      : text.split(separator.text).map(trimmed);
  if (columnCount === null || fields.length === columnCount) return fields;
  return { column: null, reason: `has ${fields.length} columns; column_count says ${columnCount}` };
}

function trimmed(field: string): string {
  return field.replace(/^[ \t]+|[ \t]+$/g, '');
}

interface RowText {
  readonly text: string;
  readonly fields: readonly string[];
  readonly context: RowContext;
}

/** Empty where there is none, or a mark for a missing value. */
function textFrom(source: Source, { text, fields, context }: RowText): string {
  const { columns, fromName } = context;
  let found: string;
  if (source.kind === 'fixed') return source.text;
  if (source.kind === 'file name') found = fromName.get(source.place) ?? '';
  else found = source.kind === 'column' ? (fields[source.column] ?? '') : trimmed(text.slice(source.from, source.to));
  return columns.missingMarks.includes(found) ? '' : found;
}

function namedSources({ pulsar, site, receiver }: TextColumns): readonly (readonly [Placeholder, NamedSource])[] {
  return [['pulsar', pulsar], ['site', site], ...(receiver === null ? [] : [['receiver', receiver] as const])];
}

function plainSources(columns: TextColumns): readonly (readonly [Column, Source])[] {
  const { uncertainty, frequency, pulseNumber, signalToNoise, note } = columns;
  const optional = [
    ['pulse_number', pulseNumber],
    ['signal_to_noise', signalToNoise],
    ['note', note],
  ] as const;
  return [
    ['uncertainty_us', uncertainty.source],
    ['frequency_mhz', frequency.source],
    ...optional.flatMap(([column, source]) => (source === null ? [] : [[column, source] as const])),
  ];
}

function nameFrom({ names }: NamedSource, text: string): string | { readonly reason: string } {
  if (names === null || text === '') return text;
  const name = names.get(text);
  if (name !== undefined) return name;
  const known = [...names.keys()].slice(0, 10).map(quoted).join(', ');
  return { reason: `${quoted(text)} is not among the feed's names (${known}): add it to them and start again` };
}

/** In the unit of the column; what is no number stays as it is, for the complaint. */
function quantity(column: Column, text: string, columns: TextColumns): string {
  if (column === 'note' || column === 'pulse_number') return text;
  if (column === 'frequency_mhz' && (text === 'inf' || columns.frequency.infinite.includes(text))) return 'inf';
  const value = decimalOf(text, { exponentLetters: lettersOf(columns) });
  if (value === null) return text;
  if (column === 'uncertainty_us') return decimalText(product(value, unitIn(TIME_UNITS, columns.uncertainty.unit)!));
  if (column === 'frequency_mhz') return decimalText(product(value, unitIn(FREQUENCY_UNITS, columns.frequency.unit)!));
  return decimalText(value);
}

function lettersOf({ exponentLetters }: TextColumns): string {
  return `eE${exponentLetters}`;
}

function withPlace(problem: RowProblem, columns: TextColumns): RowProblem {
  const sources = new Map<Column | null, Source>([
    ...plainSources(columns),
    ...namedSources(columns).map(([column, { source }]) => [column, source] as const),
    ['mjd_utc', columns.time.source],
    ['mjd_tdb', columns.time.source],
  ]);
  const source = sources.get(problem.column);
  return source === undefined ? problem : { ...problem, reason: `${placeOf(source)}${problem.reason}` };
}

/** `(column 3) `, as the configuration counts. */
function placeOf(source: Source): string {
  if (source.kind === 'column') return `(column ${source.column + 1}) `;
  if (source.kind === 'positions') return `(characters ${source.from + 1} to ${source.to}) `;
  return source.kind === 'fixed' ? '(fixed) ' : "(from the file's name) ";
}
