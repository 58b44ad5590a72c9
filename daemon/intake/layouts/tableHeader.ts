import { closestName } from '../../closestName.ts';
import { quoted, visibleText } from '../../visibleText.ts';
import { ALL_COLUMNS, REQUIRED_COLUMNS, TIME_COLUMNS } from '../arrivalFields.ts';

/** The names of a table's columns against those we know. */
export const MOST_COLUMNS = 200;

/** Why a table with these columns holds no arrivals; null: it may. */
export function headerFault(names: readonly string[]): string | null {
  const twice = names.find((name, index) => name !== '' && names.indexOf(name) < index);
  if (twice !== undefined) return `the column ${quoted(twice)} stands there twice`;
  const missing: string[] = REQUIRED_COLUMNS.filter((column) => !names.includes(column));
  if (!TIME_COLUMNS.some((column) => names.includes(column))) missing.push('mjd_utc (or mjd_tdb)');
  if (missing.length === 0) return null;
  const found = names.slice(0, 20).map(quoted).join(', ');
  return `no column ${missing.join(', ')}; found ${found.slice(0, 500)}`;
}

/** Names that are not ours, with a guess at what was meant. */
export function ignoredColumns(names: readonly string[], known: readonly string[] = ALL_COLUMNS): string[] {
  return names
    .filter((name) => !known.includes(name))
    .map((name) => {
      const near = closestName(name, known);
      return near === null ? visibleText(name) : `${visibleText(name)} (did you mean ${near}?)`;
    });
}
