import { closestName } from '../closestName.ts';
import { BARYCENTRE } from '../intake/arrivalFields.ts';
import { parseFileNamePattern } from '../intake/layouts/fileNamePattern.ts';
import type {
  FileNamePattern,
  NamedSource,
  Placeholder,
  Source,
  TextColumns,
  TimeColumns,
} from '../intake/layouts/textColumns.ts';
import { columnsTable, frequencyTable, namedTable, plainTable, timeTable, uncertaintyTable } from './columnsSchema.ts';
import type { SectionReader } from './sectionReader.ts';
import type { TomlPath } from './tomlDocument.ts';

/** Reads `[feed.columns]`; null after a complaint. Columns and characters are counted from 1 in the file, from 0 in what comes back. */
export function readColumnsTable(reader: SectionReader, path: TomlPath, sites: readonly string[]): TextColumns | null {
  const table = reader.read(path, columnsTable);
  if (table === null) return null;
  const separator = separatorOf(table.separator);
  if (separator === null && table.column_count !== undefined) {
    reader.error([...path, 'column_count'], 'goes with a separator; fixed positions have no columns to count');
  }
  const fileName = table.file_name === undefined ? null : patternOf(reader, [...path, 'file_name'], table.file_name);
  if (fileName === 'faulty') return null;
  const places = createPlaces(reader, { path, hasSeparator: separator !== null, fileName, sites });
  const parts = {
    time: places.time(),
    uncertainty: places.uncertainty(),
    frequency: places.frequency(),
    pulsar: places.named('pulsar'),
    site: places.named('site'),
  };
  const receiver = reader.has([...path, 'receiver']) ? places.named('receiver') : null;
  const plain = (key: string) => (reader.has([...path, key]) ? places.plain(key) : null);
  const optional = { pulseNumber: plain('pulse_number'), signalToNoise: plain('signal_to_noise'), note: plain('note') };
  const { time, uncertainty, frequency, pulsar, site } = parts;
  if (time === null || uncertainty === null || frequency === null || pulsar === null || site === null) return null;
  return {
    separator,
    columnCount: table.column_count ?? null,
    commentMarks: table.comment_marks,
    skipLines: table.skip_lines,
    exponentLetters: table.exponent_letters,
    missingMarks: table.missing_marks,
    fileName,
    time,
    uncertainty,
    frequency,
    pulsar,
    site,
    receiver,
    ...optional,
  };
}

function separatorOf(text: string | undefined): TextColumns['separator'] {
  if (text === undefined) return null;
  if (text === 'blanks') return text;
  return { text: text === 'tab' ? '\t' : text };
}

function patternOf(reader: SectionReader, path: TomlPath, text: string): FileNamePattern | 'faulty' {
  const pattern = parseFileNamePattern(text);
  if (!('problem' in pattern)) return pattern;
  reader.error(path, pattern.problem);
  return 'faulty';
}

interface Surroundings {
  readonly path: TomlPath;
  readonly hasSeparator: boolean;
  readonly fileName: FileNamePattern | null;
  readonly sites: readonly string[];
}

/** The tables that say where a quantity stands; each gives null after a complaint. */
function createPlaces(reader: SectionReader, around: Surroundings) {
  const at = (key: string) => [...around.path, key];
  const sourceOf = (key: string, place: Place) => sourceIn(reader, at(key), place, around);
  return {
    plain(key: string): Source | null {
      const table = reader.read(at(key), plainTable);
      return table && sourceOf(key, table);
    },
    uncertainty(): TextColumns['uncertainty'] | null {
      const table = reader.read(at('uncertainty'), uncertaintyTable);
      const source = table && sourceOf('uncertainty', table);
      return table && source && { source, unit: table.unit };
    },
    frequency(): TextColumns['frequency'] | null {
      const table = reader.read(at('frequency'), frequencyTable);
      const source = table && sourceOf('frequency', table);
      return table && source && { source, unit: table.unit, infinite: table.infinite_marks };
    },
    named(key: Placeholder): NamedSource | null {
      const table = reader.read(at(key), namedTable);
      const source = table && sourceOf(key, { ...table, placeholder: key });
      if (table === null || source === null) return null;
      const names = table.names === undefined ? null : new Map(Object.entries(table.names));
      if (key === 'site' && !areSites(reader, at(key), { source, names }, around.sites)) return null;
      return { source, names };
    },
    time(): TimeColumns | null {
      const table = reader.read(at('time'), timeTable);
      const source = table && sourceOf('time', table);
      if (table === null || source === null) return null;
      const rest = restOf(reader, at('time'), table, around);
      return rest === 'faulty' ? null : { source, rest, format: table.format, scale: table.scale };
    },
  };
}

interface Place {
  readonly column?: number | undefined;
  readonly characters?: readonly [number, number] | undefined;
  readonly fixed?: string | number | undefined;
  readonly from_file_name?: true | undefined;
  readonly placeholder?: Placeholder;
}

function sourceIn(reader: SectionReader, path: TomlPath, place: Place, around: Surroundings): Source | null {
  const { column, characters, fixed, from_file_name, placeholder } = place;
  const given = [column, characters, fixed, from_file_name].filter((value) => value !== undefined);
  const wanted = around.hasSeparator ? 'column' : 'characters';
  if (given.length !== 1) {
    reader.error(
      path,
      `must say where it stands, in one way: ${wanted}${placeholder === undefined ? '' : ', from_file_name'} or fixed`,
    );
    return null;
  }
  if (fixed !== undefined) {
    // The digits as they stand in the file.
    return { kind: 'fixed', text: reader.document.textOf([...path, 'fixed']) ?? String(fixed) };
  }
  if (from_file_name !== undefined) {
    const part = around.fileName?.find((part) => part.kind === 'gap' && part.place === placeholder);
    if (part !== undefined) return { kind: 'file name', place: placeholder! };
    reader.error([...path, 'from_file_name'], `needs file_name with {${placeholder}} in it`);
    return null;
  }
  if (column !== undefined && !around.hasSeparator) {
    reader.error([...path, 'column'], 'needs a separator; without one say characters = [first, last]');
    return null;
  }
  if (characters !== undefined && around.hasSeparator) {
    reader.error([...path, 'characters'], 'goes with no separator; with one say column = N');
    return null;
  }
  if (column !== undefined) return { kind: 'column', column: column - 1 };
  const [first, last] = characters!;
  if (last < first) {
    reader.error([...path, 'characters'], `ends before it begins: [${first}, ${last}]`);
    return null;
  }
  return { kind: 'positions', from: first - 1, to: last };
}

function restOf(
  reader: SectionReader,
  path: TomlPath,
  table: {
    readonly format: TimeColumns['format'];
    readonly rest_column?: number | undefined;
    readonly rest_characters?: readonly [number, number] | undefined;
    readonly rest_unit?: NonNullable<TimeColumns['rest']>['unit'] | undefined;
  },
  around: Surroundings,
): TimeColumns['rest'] | 'faulty' {
  const { rest_column: column, rest_characters: characters, rest_unit: unit } = table;
  if (column === undefined && characters === undefined && unit === undefined) return null;
  if (unit === undefined) {
    reader.error([...path, 'rest_unit'], 'is missing: what is the rest counted in?');
    return 'faulty';
  }
  if ((unit === 'clock') !== (table.format === 'iso8601')) {
    reader.error(
      [...path, 'rest_unit'],
      '"clock" (hh:mm:ss) goes with format = "iso8601", and the other units with the others',
    );
    return 'faulty';
  }
  const source = sourceIn(reader, path, { column, characters }, around);
  return source === null ? 'faulty' : { source, unit };
}

/** Every name that a site can get here must be one that is described. */
function areSites(
  reader: SectionReader,
  path: TomlPath,
  { source, names }: NamedSource,
  sites: readonly string[],
): boolean {
  const known = [...sites, BARYCENTRE];
  const stated: (readonly [TomlPath, string])[] = [...(names ?? [])].map(([text, site]) => [
    [...path, 'names', text],
    site,
  ]);
  if (source.kind === 'fixed' && names === null) stated.push([[...path, 'fixed'], source.text]);
  const strangers = stated.filter(([, site]) => !known.includes(site));
  for (const [at, site] of strangers) {
    const near = closestName(site, known);
    reader.error(
      at,
      `there is no [[site]] "${site}"; ${near === null ? `known: ${known.join(', ')}` : `did you mean "${near}"?`}`,
    );
  }
  return strangers.length === 0;
}
