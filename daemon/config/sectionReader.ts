import { z } from 'zod';
import { closestName } from '../closestName.ts';
import type { ConfigProblem } from './configuration.ts';
import type { TomlDocument, TomlPath, TomlValue } from './tomlDocument.ts';

/**
 * Reads one file section by section, so that a fault in one does not hide those in the next. Every complaint carries the
 * place where it stands.
 */
export interface SectionReader {
  readonly file: string;
  readonly document: TomlDocument;
  /** The value at the path as the schema returns it; null after a complaint. */
  read<Schema extends z.ZodType>(path: TomlPath, schema: Schema): z.output<Schema> | null;
  /** Paths of the tables of an array (`[[feed]]`), one each; a complaint when it is something else. */
  tablesOf(path: TomlPath): TomlPath[];
  has(path: TomlPath): boolean;
  error(path: TomlPath, message: string): void;
  warning(path: TomlPath, message: string): void;
}

export function createSectionReader(file: string, document: TomlDocument, problems: ConfigProblem[]): SectionReader {
  const complain = (severity: ConfigProblem['severity'], path: TomlPath, message: string) => {
    const { line, column } = document.placeOf(path);
    problems.push({ file, line, column, message: `${titleOf(path)}${message}`, severity });
  };
  const error = (path: TomlPath, message: string) => complain('error', path, message);
  return {
    file,
    document,
    read(path, schema) {
      const value = valueAt(document, path);
      if (value === undefined) {
        error(path, 'is missing');
        return null;
      }
      const result = schema.safeParse(value);
      if (result.success) return result.data;
      for (const issue of result.error.issues) report(issue, { path, value, schema, error });
      return null;
    },
    tablesOf(path) {
      const value = valueAt(document, path);
      if (value === undefined) return [];
      if (Array.isArray(value)) return value.map((_, index) => [...path, index]);
      const keys = path.filter((key) => typeof key === 'string');
      error(path, `must be written with double brackets: [[${keys.join('.')}]]`);
      return [];
    },
    has: (path) => valueAt(document, path) !== undefined,
    error,
    warning: (path, message) => complain('warning', path, message),
  };
}

function valueAt(document: TomlDocument, path: TomlPath): TomlValue | undefined {
  let value: TomlValue | undefined = document.root;
  for (const key of path) {
    if (typeof value !== 'object' || value instanceof Date) return undefined;
    value = (value as Record<string | number, TomlValue>)[key];
  }
  return value;
}

/** `feed 2, poll_seconds: `; a place in a list is counted from 1, as people do. */
function titleOf(path: TomlPath): string {
  let title = '';
  for (const key of path) {
    if (typeof key === 'number') title += ` ${key + 1}`;
    else title += title === '' ? key : `, ${key}`;
  }
  return title === '' ? '' : `${title}: `;
}

interface Context {
  readonly path: TomlPath;
  readonly value: TomlValue;
  readonly schema: z.ZodType;
  readonly error: (path: TomlPath, message: string) => void;
}

function report(issue: z.core.$ZodIssue, { path, value, schema, error }: Context): void {
  const inner = issue.path.filter((key): key is string | number => typeof key !== 'symbol');
  const at = [...path, ...inner];
  if (issue.code === 'unrecognized_keys') {
    const known = keysOf(schema);
    for (const key of issue.keys) error([...at, key], unknownKeyMessage(key, known));
    return;
  }
  if (issue.code === 'invalid_type') {
    const found = within(value, inner);
    error(
      at,
      found === undefined ? 'is missing' : `must be ${KINDS[issue.expected] ?? issue.expected}, found ${kindOf(found)}`,
    );
    return;
  }
  error(at, issue.message);
}

function unknownKeyMessage(key: string, known: readonly string[]): string {
  const near = closestName(key, known);
  return `unknown key; ${near === null ? `known here: ${known.join(', ')}` : `did you mean "${near}"?`}`;
}

const KINDS: Readonly<Record<string, string>> = {
  string: 'a text in quotes',
  number: 'a number',
  int: 'a whole number',
  boolean: 'true or false',
  array: 'a list in [brackets]',
  tuple: 'a list in [brackets]',
  object: 'a table of keys',
};

function kindOf(value: TomlValue): string {
  if (typeof value === 'string') return 'a text';
  if (typeof value === 'number') return Number.isFinite(value) ? 'a number' : `${value}`;
  if (typeof value === 'boolean') return `${value}`;
  if (value instanceof Date) return 'a date';
  return Array.isArray(value) ? 'a list' : 'a table';
}

function within(value: TomlValue, path: TomlPath): TomlValue | undefined {
  let inner: TomlValue | undefined = value;
  for (const key of path) inner = (inner as Record<string | number, TomlValue> | undefined)?.[key];
  return inner;
}

/** Nested tables are read by their own schemas, so a complaint about keys is always about the outermost table. */
function keysOf(schema: z.ZodType): string[] {
  return schema instanceof z.ZodObject ? Object.keys(schema.shape) : [];
}
